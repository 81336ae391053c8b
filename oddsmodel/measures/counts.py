"""Records and events by the levels of a column, with counts as true frequencies."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.words import number_text
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import Leaf

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class LevelCounts:
    """records (k,), events (k,) of the k levels in order."""

    levels: tuple[str, ...]
    records: NDArray[np.int64]
    events: NDArray[np.int64]


def level_counts(
    values: pd.Series, event: NDArray[np.bool_], counts: Array | None, levels: Sequence[str]
) -> LevelCounts:
    """Records and events at each of the levels; rows not recorded or at another level are counted nowhere.

    values (n,): a categorical of the levels. event (n,): whether the event happened. counts (n,): true frequencies.
    """
    codes = level_codes(values, levels)
    known = codes >= 0
    weight = None if counts is None else counts[known]
    records = np.bincount(codes[known], weights=weight, minlength=len(levels))
    happened = known & event
    weight = None if counts is None else counts[happened]
    events = np.bincount(codes[happened], weights=weight, minlength=len(levels))
    return LevelCounts(tuple(levels), whole(records), whole(events))


def level_codes(values: pd.Series, levels: Sequence[str]) -> NDArray[np.int64]:
    """The position of each value among the levels (n,), -1 where it is none of them.

    The values of a number column taken as levels have the text that the design gives them.
    """
    categorical = pd.Categorical(values)
    number = pd.api.types.is_float_dtype(categorical.categories.dtype)
    names = [number_text(float(one)) if number else str(one) for one in categorical.categories]
    place = {level: position for position, level in enumerate(levels)}
    lookup = np.array([*(place.get(name, -1) for name in names), -1], dtype=np.int64)
    return lookup[np.asarray(categorical.codes)]


def whole(values: NDArray[np.float64] | NDArray[np.int64]) -> NDArray[np.int64]:
    """Sums of true frequencies as whole numbers."""
    return np.rint(values).astype(np.int64)


def exposure_counts(model: FittedModel, name: str) -> LevelCounts | None:
    """Records analysed and events at the levels of an exposure; None for a number that the model takes as a number.

    The levels are those of the records in their order; of a number taken as levels or cut into bands, the model's.
    """
    levels = model_levels(model, name)
    if not levels:
        return None
    if model.columns[name].levels:
        counted = model.people.of(name)
        return level_counts(counted.frame[name], counted.event, counted.counts, levels)
    records, events = model.rows.passes.reduce([_AtIndicators()], level_columns(model, name))[0]
    return LevelCounts(levels, whole(records), whole(events))


class _AtIndicators:
    """Records and events at none and at each of some indicator columns."""

    def leaf(self, rows: Leaf, own: list[int]) -> tuple[Array, Array]:
        at = rows["X"][:, own] == 1.0
        at = np.column_stack([~at.any(axis=1), at]).astype(np.float64)
        trials = rows.get("trials")
        return at.sum(axis=0) if trials is None else trials @ at, rows["events"] @ at


def model_levels(model: FittedModel, name: str) -> tuple[str, ...]:
    """The levels of a column in order: those of the records, or for a number taken as levels the model's."""
    return model.columns[name].levels or design_levels(model, name)


def design_levels(model: FittedModel, name: str) -> tuple[str, ...]:
    """The levels of a column that the model has indicators for, their reference first; empty where it has none."""
    own = [model.design.columns[position] for position in level_columns(model, name)]
    found = dict.fromkeys(str(column.reference) for column in own)
    return tuple(found | dict.fromkeys(str(column.level) for column in own))


def level_columns(model: FittedModel, name: str) -> list[int]:
    """The positions of the indicators of the column's levels in the model matrix."""
    return [
        position
        for position, column in enumerate(model.design.columns)
        if column.sources == (name,) and column.kind == "level"
    ]
