"""A column of numbers as whole multiples of a unit, so that equal sums are found to be equal."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.errors import OddsmodelError
from oddsmodel.likelihood.base import Array

Whole = NDArray[np.int64]

MOST_DECIMALS = 6
MOST_STEPS = 10_000
"""Multiples of a unit that is no decimal fraction: more of them would be found in any numbers at all."""

LARGEST = 2.0**50


class ManyValuedColumn(OddsmodelError):
    """Column `column` (position in the matrix) has no common unit, or sums with too many values to be told apart.

    Hardly any other data would have the observed sum of such a column, so that exact inference would say nothing.
    """

    def __init__(self, column: int) -> None:
        self.column = column
        super().__init__(f"the column at position {column} takes too many different values for exact sums")


def whole_numbers(values: Array, *, from_zero: bool) -> tuple[Whole, float] | None:
    """Whole numbers k (m,) and a unit > 0 with values = c + unit · k; None where there are none.

    c is zero if from_zero, and otherwise free. Decimal fractions of up to six places are recognised exactly as they
    are written; other numbers (thirds, years divided by their standard deviation) by a common divisor found by Euclid's
    algorithm to within rounding, with multiples up to 10 000.
    """
    for decimals in range(MOST_DECIMALS + 1):
        power = 10.0**decimals
        multiple = np.rint(values * power)
        if np.abs(multiple).max() > LARGEST:
            return None
        if (multiple / power == values).all():
            return multiple.astype(np.int64), 1.0 / power
    origin = 0.0 if from_zero else float(values.min())
    distance = values - origin
    rounding = 64.0 * np.finfo(float).eps * float(np.abs(values).max())
    largest = float(np.abs(distance).max())
    rest = np.unique(np.abs(distance))
    while True:
        rest = rest[rest > rounding]
        unit = float(rest[0])
        if largest > MOST_STEPS * unit:
            return None
        rest = np.unique(np.append(np.abs(rest - np.rint(rest / unit) * unit), unit))
        if rest[rest > rounding].size == 1:
            break
    steps = np.rint(distance / unit)
    unit = float(distance @ steps) / float(steps @ steps)
    if (np.abs(distance - steps * unit) > rounding).any():
        return None
    return steps.astype(np.int64), unit
