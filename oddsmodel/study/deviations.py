"""The standard deviation that "per SD" stands for: the main model's, in every model of the study."""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping
from dataclasses import replace

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.training import merged_values
from oddsmodel.design.weighted import weighted_deviation
from oddsmodel.records.types import Column
from oddsmodel.results.study import StandardDeviation

Array = NDArray[np.float64]


def with_deviations(
    columns: Mapping[str, Column], used: Collection[str], frame: pd.DataFrame, counts: Array | None
) -> dict[str, Column]:
    """The columns, those told per standard deviation with that of the main model's records.

    used: the columns of any model. frame (n rows), counts (n,): the records the main model analyses. A column that the
    main model does not hold has its deviation from those of them that have it recorded. Where fewer than two do, or all
    are equal, it is left to each model.
    """

    def values(name: str) -> tuple[Array, Array]:
        x = frame[name].to_numpy(dtype=np.float64)
        recorded = np.isfinite(x)
        return merged_values(x[recorded], None if counts is None else counts[recorded])

    return with_deviations_of(columns, used, values)


def with_deviations_of(
    columns: Mapping[str, Column], used: Collection[str], values: Callable[[str], tuple[Array, Array]]
) -> dict[str, Column]:
    """The same from the recorded values (j,) of a column and their counts (j,)."""
    found = dict(columns)
    for name in used:
        column = columns[name]
        if column.per != "SD" or column.kind != "number":
            continue
        deviation = weighted_deviation(*values(name), lost=1)
        if deviation > 0.0:
            found[name] = replace(column, deviation=deviation)
    return found


def standard_deviations(columns: Mapping[str, Column]) -> tuple[StandardDeviation, ...]:
    """What is told of the deviations: a value a column."""
    return tuple(
        StandardDeviation(column.name, column.label, column.units, column.deviation)
        for column in columns.values()
        if column.deviation is not None
    )
