"""Values and names written as TOML or as formula language, whatever characters they hold."""

from __future__ import annotations

import keyword
import re
import unicodedata
from collections.abc import Iterable, Mapping
from datetime import date
from typing import Any

_BARE_KEY = re.compile(r"[A-Za-z0-9_-]+")
_NAMED_ESCAPES = {"\\": "\\\\", '"': '\\"', "\n": "\\n", "\r": "\\r", "\t": "\\t", "\b": "\\b", "\f": "\\f"}
_UNSEEN = {"Cc", "Cf", "Zl", "Zp", "Co", "Cn"}

FORMULA_WORDS = frozenset(
    {
        "C",
        "I",
        "Q",
        "bs",
        "cc",
        "center",
        "cr",
        "cut",
        "exp",
        "log",
        "log10",
        "log2",
        "np",
        "rcs",
        "sqrt",
        "standardize",
    }
    | {"Treatment", "Sum", "Poly"}
)
"""Names that have a meaning in a formula, so that a column of that name is better written with Q."""


def writable(text: str) -> bool:
    """Whether a text can stand in a TOML file at all: UTF-8 has no lone surrogates."""
    return not any(unicodedata.category(character) == "Cs" for character in text)


def text_value(text: str) -> str:
    """A text as a TOML string on one line; what cannot be seen is written as \\u escapes."""
    return f'"{"".join(_escaped(character) for character in text)}"'


def _escaped(character: str) -> str:
    if character in _NAMED_ESCAPES:
        return _NAMED_ESCAPES[character]
    if unicodedata.category(character) in _UNSEEN:
        code = ord(character)
        return f"\\u{code:04X}" if code < 0x10000 else f"\\U{code:08X}"
    return character


def text_list(texts: Iterable[str]) -> str:
    """Texts as a TOML list on one line."""
    return f"[{', '.join(text_value(text) for text in texts)}]"


def key(name: str) -> str:
    """A name as a TOML key, in quotes where it needs them."""
    return name if _BARE_KEY.fullmatch(name) else text_value(name)


def formula_name(name: str) -> str:
    """A column's name as it stands in a formula: itself, or Q("...") where it is no plain word."""
    plain_word = name.isidentifier() and not keyword.iskeyword(name) and name not in FORMULA_WORDS
    if plain_word and unicodedata.normalize("NFKC", name) == name:
        return name
    return f"Q({name!r})"


def document(values: Mapping[str, Any]) -> str:
    """Sections of a plan as TOML: `columns` one section each, `models` one entry each, the others flat."""
    parts: list[str] = []
    for section, content in values.items():
        if section == "columns":
            parts.extend(_section(f"[columns.{key(name)}]", column) for name, column in content.items())
        elif section == "models":
            parts.extend(_section("[[models]]", model) for model in content)
        else:
            parts.append(_section(f"[{section}]", content))
    return "\n".join(parts)


def _section(heading: str, content: Mapping[str, Any]) -> str:
    lines = [f"{key(name)} = {_value(value)}" for name, value in content.items() if value is not None]
    return "\n".join([heading, *lines, ""])


def _value(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int | float):
        return repr(value)
    if isinstance(value, str):
        return text_value(value)
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, Mapping):
        return f"{{{', '.join(f'{key(name)} = {_value(item)}' for name, item in value.items())}}}"
    return f"[{', '.join(_value(item) for item in value)}]"
