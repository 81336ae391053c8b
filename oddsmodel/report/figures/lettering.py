"""Text inside figures: cleaned, measured by eye and folded to the room there is."""

from __future__ import annotations

import unicodedata

from oddsmodel.wording.plain import plain

_NARROW = frozenset("ijlftrI.,:;'|!()[]{} /-‐–\u202f\u2009\u00a0")
_WIDE = frozenset("mwMW@%&—")
LONGEST = 160


def width_of(text: str, size: float) -> float:
    """Rough width in the units of `size`, on the generous side, since the reader's font is not known."""
    return size * sum(_share(letter) for letter in text)


def _share(letter: str) -> float:
    if unicodedata.east_asian_width(letter) in "WF":
        return 1.05
    if letter in _NARROW:
        return 0.37
    if letter in _WIDE:
        return 0.95
    return 0.69 if letter.isupper() else 0.59


def fold(text: str, size: float, room: float, lines: int = 4) -> list[str]:
    """The text in at most `lines` lines no wider than `room`; what does not fit ends in an ellipsis."""
    folded = [""]
    cleaned = plain(text, LONGEST)
    for word in cleaned.split():
        for piece in _pieces(word, size, room):
            joined = f"{folded[-1]} {piece}".strip()
            if width_of(joined, size) <= room:
                folded[-1] = joined
            else:
                folded.append(piece)
    if len(folded) > lines:
        folded = folded[:lines]
        folded[-1] = f"{folded[-1][:-1].rstrip()}…"
    return folded


def _pieces(word: str, size: float, room: float) -> list[str]:
    """A word cut where it is wider than a whole line."""
    pieces = [""]
    for letter in word:
        if pieces[-1] and width_of(pieces[-1] + letter, size) > room:
            pieces.append("")
        pieces[-1] += letter
    return pieces
