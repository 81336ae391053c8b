"""The nearest of the words that would have been right."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import SequenceMatcher
from itertools import islice

ALIKE = 0.6
LONGEST_WORD = 80
MOST_CANDIDATES = 5000


def nearest(word: str, candidates: Iterable[str]) -> str | None:
    """The candidate most like `word`, or None where none is much like it.

    Case, hyphens, underscores and spaces are told apart last; of equals the first candidate wins. Likeness is
    the share of matching characters (Ratcliff & Metzener 1988), at least 0.6.
    """
    wanted = _plain(word)
    if not wanted:
        return None

    best: str | None = None
    best_ratio = ALIKE
    matcher = SequenceMatcher(autojunk=False)
    matcher.set_seq2(wanted)
    for candidate in islice(candidates, MOST_CANDIDATES):
        if candidate == word:
            return candidate
        matcher.set_seq1(_plain(candidate))
        if matcher.real_quick_ratio() < best_ratio or matcher.quick_ratio() < best_ratio:
            continue
        ratio = matcher.ratio()
        if ratio > best_ratio or (ratio == best_ratio and best is None):
            best, best_ratio = candidate, ratio
    return best


def _plain(word: str) -> str:
    return word[:LONGEST_WORD].casefold().replace("-", " ").replace("_", " ").strip()
