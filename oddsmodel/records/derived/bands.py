"""Bands of a number between edges that the plan gives; a band holds its lower edge."""

from __future__ import annotations

import numpy as np

from oddsmodel.plan.band_names import band_names
from oddsmodel.records.derived.making import Made, Making, number_values, with_levels


def bands(making: Making) -> Made:
    """An ordered column of the bands of `edges` (k,), which has k + 1 levels.

    Raises: InputFault where the source is no number.
    """
    numbers = number_values(making, making.sources[0])
    edges = making.section.edges or ()
    levels = band_names(edges)
    position = np.searchsorted(np.asarray(edges, dtype=np.float64), numbers, side="right")
    codes = np.where(np.isnan(numbers), -1, position).astype(np.intp)
    return Made(with_levels(making, "ordered", levels, codes))
