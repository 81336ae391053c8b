"""How well a linear predictor tells outcomes apart, and how close its probabilities come, on any counts of records."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.probability_groups import TIE
from oddsmodel.likelihood.logistic import logistic

Array = NDArray[np.float64]
Counts = NDArray[np.signedinteger[Any]]

MOST_STEPS, MOST_HALVINGS = 50, 30
DECREMENT, FLAT = 1e-10, 1e-9
"""Newton decrement squared at which a step is the last, and curvature a record below which outcomes are separated."""


class Line(NamedTuple):
    """logit risk = intercept + slope × linear predictor."""

    intercept: float
    slope: float


class Pairs(NamedTuple):
    """Pairs of a record with the event and one without: how many, and in how many the former is higher (ties: half)."""

    number: float
    right: float


@dataclass(frozen=True)
class Scores:
    """Linear predictors (m,) in their order, to be counted by any numbers of records."""

    linear: Array
    order: NDArray[np.intp]
    starts: NDArray[np.intp]

    @classmethod
    def of(cls, linear: Array) -> Scores:
        """Those closer than 1e-10, relative to the largest or to 1, are equal."""
        order = np.argsort(linear, kind="stable")
        rising = linear[order]
        least = TIE * max(1.0, abs(float(rising[0])), abs(float(rising[-1])))
        return cls(linear, order, np.flatnonzero(np.diff(rising, prepend=-np.inf) > least))

    def pairs(self, events: Counts, trials: Counts) -> Pairs:
        """The pairs among records with events and trials (m,)."""
        happened = np.add.reduceat(events[self.order].astype(np.float64), self.starts)
        others = np.add.reduceat((trials - events)[self.order].astype(np.float64), self.starts)
        right = float(happened @ (np.cumsum(others) - others / 2.0))
        return Pairs(float(happened.sum()) * float(others.sum()), right)


def squared_distance(linear: Array, events: Counts, trials: Counts) -> float:
    """Sum over the records of (outcome − probability)², for linear predictors (m,) with events and trials (m,)."""
    small, whole, risk = logistic(linear)
    complement = np.maximum(small, linear < 0.0) / whole
    happened = events.astype(np.float64)
    return float(happened @ complement**2 + (trials - happened) @ risk**2)


def calibration_line(linear: Array, events: Counts, trials: Counts) -> Line | None:
    """The calibration slope, with its intercept, for linear predictors (m,) with events and trials (m,).

    The maximum-likelihood line of the outcome on the linear predictor (Cox 1958, Biometrika 45:562-565); a slope below
    1 is that of predictions too far from the middle. None where there is no such line: equal linear predictors, or
    outcomes that they separate.
    """
    linear, happened, counted = _used(linear, events, trials)
    middle = float(np.average(linear, weights=counted))
    spread = float(np.sqrt(np.average((linear - middle) ** 2, weights=counted)))
    if not spread > TIE * max(1.0, abs(middle)):
        return None
    apart = (linear - middle) / spread
    found = _newton(np.stack([np.ones_like(apart), apart]), happened, counted, np.array([middle, spread]), 0.0)
    if found is None:
        return None
    slope = float(found[1]) / spread
    return Line(float(found[0]) - slope * middle, slope)


def calibration_in_the_large(linear: Array, events: Counts, trials: Counts) -> float | None:
    """The intercept of the outcome beside the linear predictor (m,), its slope held at 1 (Cox 1958).

    Above 0 where more events happened than the probabilities say. None where all outcomes are equal.
    """
    if not 0 < events.sum() < trials.sum():
        return None
    linear, happened, counted = _used(linear, events, trials)
    found = _newton(np.ones((1, linear.size)), happened, counted, np.zeros(1), linear)
    return None if found is None else float(found[0])


def _used(linear: Array, events: Counts, trials: Counts) -> tuple[Array, Array, Array]:
    """The rows that stand for records."""
    used = np.flatnonzero(trials)
    return linear[used], events[used].astype(np.float64), trials[used].astype(np.float64)


def _newton(rows: Array, events: Array, trials: Array, start: Array, offset: Array | float) -> Array | None:
    """The maximum (r,) of a binomial likelihood with r orthonormal columns as rows (r, m), each of mean square 1.

    None where the outcomes are separated, or it is not reached.
    """
    beta, step, value = start, np.zeros_like(start), -np.inf
    halved = 0
    for _ in range(MOST_STEPS):
        linear = offset + (beta + step) @ rows
        small, whole, risk = logistic(linear)
        there = float(events @ linear - trials @ (np.maximum(linear, 0.0) + np.log1p(small)))
        if not there >= value - 1e-12 * abs(there):
            step, halved = step / 2.0, halved + 1
            if halved > MOST_HALVINGS:
                return None
            continue
        beta, value, halved = beta + step, there, 0
        score = rows @ (events - trials * risk)
        information = (rows * (trials * small / whole**2)) @ rows.T
        if not float(np.linalg.eigvalsh(information)[0]) > FLAT * float(trials.sum()):
            return None
        step = np.linalg.solve(information, score)
        if float(score @ step) <= DECREMENT:
            return np.asarray(beta + step)
    return None
