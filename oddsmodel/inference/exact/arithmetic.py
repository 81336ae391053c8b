"""Numbers of outcomes, as they are or as logarithms."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.special import gammaln

from oddsmodel.inference.exact.rows import Rows
from oddsmodel.likelihood.base import Array

MOST_COUNTED = 690.0
"""Log of the number of all outcomes up to which numbers are held as they are: exp(709) is the greatest there is."""


@dataclass(frozen=True)
class Arithmetic:
    """How numbers of outcomes are held, added and multiplied.

    As floating-point numbers they are exact up to 2**53, and beyond it each sum of positive terms is right to a few
    units of the last of 16 digits, since nothing is ever subtracted.
    """

    logarithms: bool
    none: float
    one: float
    add: Callable[..., Any]
    multiply: Callable[..., Any]

    def binomial(self, trials: int) -> Array:
        """The binomial coefficients (trials + 1,) of 0, 1, ... events, from whole numbers of any length."""
        coefficient, held = 1, [self.one]
        for y in range(trials // 2):
            coefficient = coefficient * (trials - y) // (y + 1)
            held.append(math.log(coefficient) if self.logarithms else float(coefficient))
        return np.array(held + held[: (trials + 1) // 2][::-1])


COUNTS = Arithmetic(False, 0.0, 1.0, np.add, np.multiply)
LOGARITHMS = Arithmetic(True, -np.inf, 0.0, np.logaddexp, np.add)


def arithmetic(rows: Rows) -> Arithmetic:
    """That in which the number of all outcomes, those with the observed events in each stratum, can be held.

    Every outcome of some rows that is kept can be completed in at least one way, so no number exceeds it.
    """
    if not rows.totals_fixed:
        log_outcomes = float(rows.trials.sum()) * math.log(2.0)
    else:
        number = np.bincount(rows.stratum, weights=rows.trials, minlength=len(rows.stratum_events))
        events = rows.stratum_events
        log_outcomes = float((gammaln(number + 1) - gammaln(events + 1) - gammaln(number - events + 1)).sum())
    return COUNTS if log_outcomes <= MOST_COUNTED else LOGARITHMS
