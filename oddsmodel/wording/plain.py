"""Text from a plan or a file of records, made fit to stand inside a message on one line of a terminal."""

from __future__ import annotations

import re
import unicodedata

LONGEST = 60
_LONGEST_ADDRESS = 500
_CREDENTIALS = re.compile(rf"://\S{{0,{_LONGEST_ADDRESS}}}@")
_STRIPPED = {"Cc", "Cf", "Cs", "Co", "Cn"}


def plain(text: str, longest: int | None = None) -> str:
    """`text` on one line without control, formatting (right-to-left marks and the like) or unassigned characters.

    Who signs in at an address, and with which password, is never shown. Line breaks and tabs become spaces; beyond
    `longest` characters the rest is cut off and "…" stands for it.
    """
    if longest is not None:
        text = text[: 4 * longest + _LONGEST_ADDRESS]
    kept = _CREDENTIALS.sub("://…@", text)
    if not kept.isprintable():
        spaced = "".join(" " if unicodedata.category(c) in ("Zl", "Zp") or c in "\n\r\t\v\f" else c for c in kept)
        kept = "".join(c for c in spaced if unicodedata.category(c) not in _STRIPPED)
    if longest is not None and len(kept) > longest:
        return kept[: longest - 1].rstrip() + "…"
    return kept


def quoted(text: str, longest: int = LONGEST) -> str:
    """`text` made plain, between the quotation marks of a sentence."""
    return f"“{plain(text, longest)}”"


def as_code(text: str, longest: int = LONGEST) -> str:
    """`text` made plain, between the straight quotation marks of a plan or a condition, to be copied from there."""
    return f'"{plain(text, longest)}"'
