"""Values that look like codes for "not recorded": asked about, never taken out."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from numpy.typing import NDArray

CODES = (7, 8, 9, 77, 88, 96, 97, 98, 99, 777, 888, 997, 998, 999, 7777, 8888, 9998, 9999, 88888, 99999, 999999)
BELOW = (-1, -2)
LIKE_NOT_RECORDED = {
    "na", "n/a", "n.a.", "nan", "nd", "n.d.", "null", "-", "--", ".", "..", "?", "??", "missing",
    "unknown", "unk", "not known", "not recorded", "not stated", "not available", "not applicable", "no data", "#n/a",
    "#null!", "<na>", "inf",
}  # fmt: skip
FEW_VALUES = 12
PILE = 3


def looks_not_recorded(texts: Iterable[str]) -> list[str]:
    """The texts that people write for "not recorded"."""
    return [text for text in texts if text.casefold() in LIKE_NOT_RECORDED]


def suspected_codes(
    values: NDArray[np.float64], counts: NDArray[np.int64], different: int | None = None
) -> list[float]:
    """Codes at an edge of the numbers that stand apart from the rest or are piled up.

    values: the different numbers met, sorted (k,); counts: their records (k,). A code (9, 99, 999, -1, ...) at the
    upper or lower edge is suspected when the gap to the next number is wider than all the others together; when
    it is at least twice as wide as the widest gap between few numbers; when it is at least twice the usual gap and
    the code has three records or more and twice as many as its neighbour; or when it is the only negative number.

    different: how many numbers are met at least, where `values` has only the lowest and the highest of them. The usual
    gap is then known to be at most twice the mean one, and a code that is piled up is suspected where that suffices.
    """
    lower, upper = 0, len(values)
    found: list[float] = []
    while upper - lower > 2 and values[upper - 1] in CODES:
        edge = _edge_codes(values, lower, upper)
        if not _apart(values[lower:upper], counts[lower:upper], edge, different):
            break
        found.extend(float(value) for value in values[upper - edge : upper])
        upper -= edge
    while upper - lower > 2 and _is_code(values[lower]) and values[lower] < 0:
        edge = _edge_codes(-values[::-1], len(values) - upper, len(values) - lower)
        inner = values[lower + edge : upper]
        alone = len(inner) > 0 and inner[0] >= 0
        if not (alone or _apart(-values[lower:upper][::-1], counts[lower:upper][::-1], edge, different)):
            break
        found.extend(float(value) for value in values[lower : lower + edge])
        lower += edge
    return sorted(found)


def _is_code(value: float) -> bool:
    return abs(value) in CODES or value in BELOW


def _edge_codes(values: NDArray[np.float64], lower: int, upper: int) -> int:
    """How many codes that follow on each other (98, 99) stand at the upper edge."""
    edge = 1
    while (
        upper - edge - 1 > lower + 1
        and _is_code(values[upper - edge - 1])
        and values[upper - edge] - values[upper - edge - 1] == 1
    ):
        edge += 1
    return edge


def _apart(values: NDArray[np.float64], counts: NDArray[np.int64], edge: int, different: int | None) -> bool:
    """Whether the uppermost `edge` values stand apart from the rest or are piled up."""
    rest, codes = values[:-edge], values[-edge:]
    gap = codes[0] - rest[-1]
    gaps = np.diff(rest)
    if len(gaps) == 0:
        return False
    if gap > rest[-1] - rest[0]:
        return True
    if len(rest) <= FEW_VALUES and gap >= 2 * gaps.max():
        return True
    piled = counts[-edge:].max() >= max(PILE, 2 * counts[-edge - 1])
    usual = np.median(gaps) if different is None else 2 * (rest[-1] - rest[0]) / (different - len(values))
    return bool(piled and gap >= 2 * usual)
