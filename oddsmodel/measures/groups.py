"""The groups that the characteristics are shown by: case status, the exposure's levels, or thirds of a number."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.measures.counts import level_codes
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.records.types import Column
from oddsmodel.wording import say
from oddsmodel.wording.numbers import count

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Groups:
    """labels of the g groups in order; codes (n,): each row's group, -1 for none; described: how they were made.

    `by` is the column they are made from, None for case status. cuts: of a number, the largest value of every group but
    the last; None where the groups are levels or case status.
    """

    labels: tuple[str, ...]
    codes: NDArray[np.int64]
    described: str
    by: str | None = None
    cuts: tuple[float, ...] | None = None


def groups_of_study(
    study_design: str,
    exposure: Column,
    frame: pd.DataFrame,
    event: NDArray[np.bool_],
    counts: Array | None = None,
) -> Groups:
    """Case status for a case-control study, else the groups of the exposure: its levels, or its thirds for a number.

    frame (n rows), event (n,), counts (n,) or None: the records to be described.
    """
    if study_design in CASE_CONTROL:
        return Groups(("Cases", "Controls"), np.where(event, 0, 1).astype(np.int64), say("groups-case-status"))
    values = frame[exposure.name]
    if exposure.levels:
        described = say("groups-levels", label=exposure.label)
        return Groups(exposure.levels, level_codes(values, exposure.levels), described, exposure.name)
    return _thirds(exposure, values.to_numpy(dtype=np.float64), counts)


def _thirds(column: Column, values: Array, counts: Array | None) -> Groups:
    """Groups up to and above the least values with a third and two thirds of the records at or below them.

    Many equal values can make two groups, or one, of the three.
    """
    recorded = np.isfinite(values)
    distinct, place = np.unique(values[recorded], return_inverse=True)
    weight = None if counts is None else counts[recorded]
    cumulated = np.cumsum(np.bincount(place, weights=weight, minlength=distinct.size).astype(np.float64))

    # No value at all: a single group of nobody.
    if distinct.size == 0:
        return Groups((column.label,), np.full(values.size, -1), say("groups-one", label=column.label), column.name, ())
    wanted = np.array([1.0, 2.0]) / 3.0 * cumulated[-1] * (1.0 - 1e-12)
    cuts = np.unique(distinct[np.searchsorted(cumulated, wanted)])
    cuts = cuts[cuts < distinct[-1]]
    codes = np.full(values.size, -1, dtype=np.int64)
    codes[recorded] = np.searchsorted(cuts, values[recorded], side="left")
    if cuts.size == 0:
        return Groups((column.label,), codes, say("groups-one", label=column.label), column.name, ())
    unit = f" {column.units}" if column.units else ""
    edges = [plain_number(float(cut)) for cut in cuts]
    between = [f"above {low}, up to {high}" for low, high in pairwise(edges)]
    spans = [f"up to {edges[0]}", *between, f"above {edges[-1]}"]
    labels = tuple(f"{span}{unit}" for span in spans)
    return Groups(
        labels, codes, say("groups-thirds", label=column.label, groups=len(labels)), column.name, tuple(cuts.tolist())
    )


def plain_number(value: float) -> str:
    """A cut point: a whole number as it is, another with four significant digits."""
    text = count(round(value)) if value == round(value) and abs(value) < 1e15 else f"{value:.4g}"
    return text.replace("-", "−")
