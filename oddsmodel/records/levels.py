"""A column with levels: each text to its level, whatever its spelling; levels that the plan does not know are told."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.records.kinds import is_number
from oddsmodel.records.rows import Weights, occurrences
from oddsmodel.records.same_value import same_value_key, yes_or_no

YES_NO = ("no", "yes")
OUTSIDE = -2


@dataclass(frozen=True, slots=True)
class CodedLevels:
    """codes (n,): position of each row's level, -1 not recorded, -2 a value that is none of the levels.

    counts: rows by level. outside: values that are none of the levels, with their rows' number, the most frequent
    first.
    """

    levels: tuple[str, ...]
    codes: NDArray[np.intp]
    counts: tuple[int, ...]
    outside: tuple[tuple[str, int], ...]

    def series(self, ordered: bool = False) -> pd.Series:
        """The column as a pandas categorical with exactly the levels."""
        categories = pd.Index(list(self.levels), dtype=object)
        codes = np.where(self.codes >= 0, self.codes, -1)
        return pd.Series(pd.Categorical.from_codes(codes, categories=categories, ordered=ordered))


def code_levels(
    values: pd.Series,
    not_recorded: Collection[str],
    *,
    levels: Sequence[str] | None,
    kind: str,
    keep_order: bool = False,
    weights: Weights | None = None,
) -> CodedLevels:
    """The levels of a column.

    levels: those of the plan; None takes the values met, numbers by size and texts by code point (or, with
    `keep_order`, as the categories stand). Of several spellings of a value the plainest number or the most
    frequent text is kept. A yes-no column without levels of its own has the levels no and yes. weights (n,): rows that
    each value stands for.
    """
    texts, codes = _texts_and_codes(values)
    counts = occurrences(codes, len(texts), weights)
    keys = [same_value_key(text) for text in texts]
    if kind == "yes-no" and levels is None:
        levels = YES_NO
    if levels is None:
        levels = _levels_met(texts, keys, counts, not_recorded, keep_order)
    position = {same_value_key(level): number for number, level in enumerate(levels)}
    said = {yes_or_no(level): number for number, level in enumerate(levels)} if kind == "yes-no" else {}
    if None in said or len(said) < len(levels):
        said = {}
    to_level = np.full(len(texts) + 1, OUTSIDE, dtype=np.intp)
    to_level[-1] = -1
    for number, (key, text) in enumerate(zip(keys, texts, strict=True)):
        if key in not_recorded or not text:
            to_level[number] = -1
        elif key in position:
            to_level[number] = position[key]
        elif (answer := yes_or_no(text)) in said:
            to_level[number] = said[answer]
    coded = to_level[codes]
    by_level = occurrences(coded, len(levels), weights)
    outside = [(texts[at], int(counts[at])) for at in np.flatnonzero(to_level[:-1] == OUTSIDE) if counts[at]]
    outside.sort(key=lambda found: (-found[1], found[0]))
    return CodedLevels(tuple(levels), coded, tuple(int(count) for count in by_level), tuple(outside))


def _texts_and_codes(values: pd.Series) -> tuple[list[str], NDArray[np.intp]]:
    """The different values as texts and each row's code (n,), -1 where the cell is empty."""
    if isinstance(values.dtype, pd.CategoricalDtype):
        return list(values.cat.categories), np.asarray(values.cat.codes, dtype=np.intp)
    codes, found = pd.factorize(values.to_numpy(dtype=np.float64))
    return [same_value_key(float(number)) for number in found], np.asarray(codes, dtype=np.intp)


def _levels_met(
    texts: Sequence[str],
    keys: Sequence[str],
    counts: Weights,
    not_recorded: Collection[str],
    keep_order: bool,
) -> list[str]:
    """The values met, one spelling each, in their order."""
    spelt: dict[str, tuple[int, str]] = {}
    for key, text, count in zip(keys, texts, counts, strict=True):
        if key in not_recorded or count == 0 or not text:
            continue
        best = spelt.get(key)
        if best is None or (best[1] != key and (text == key or count > best[0])):
            spelt[key] = (int(count), text)
    levels = [text for _, text in spelt.values()]
    return levels if keep_order else sorted(levels, key=_by_size_or_text)


def _by_size_or_text(level: str) -> tuple[int, float, str]:
    return (0, float(level), level) if is_number(level) else (1, 0.0, level)


def spelled_alike(levels: Sequence[str]) -> list[str]:
    """Levels that differ from another only in case."""
    folded: dict[str, list[str]] = {}
    for level in levels:
        folded.setdefault(level.casefold(), []).append(level)
    return [level for alike in folded.values() if len(alike) > 1 for level in alike]
