"""Records and events by the levels of a column, with counts as true frequencies."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.model.fitted import FittedModel

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
    """The position of each value among the levels (n,), -1 where it is none of them."""
    categorical = pd.Categorical(values)
    place = {level: position for position, level in enumerate(levels)}
    names = [place.get(str(category), -1) for category in categorical.categories]
    lookup = np.array([*names, -1], dtype=np.int64)
    return lookup[np.asarray(categorical.codes)]


def whole(values: NDArray[np.float64] | NDArray[np.int64]) -> NDArray[np.int64]:
    """Sums of true frequencies as whole numbers."""
    return np.rint(values).astype(np.int64)


def model_levels(model: FittedModel, name: str) -> tuple[str, ...]:
    """The levels of a column in order: those of the records, or for a number taken as levels those of the model."""
    levels = model.columns[name].levels
    if levels:
        return levels
    own = [column for column in model.design.columns if column.sources == (name,) and column.kind == "level"]
    found = dict.fromkeys(str(column.reference) for column in own)
    return tuple(found | dict.fromkeys(str(column.level) for column in own))
