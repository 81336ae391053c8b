"""Estimates, limits and tests from one conditional distribution, at every log odds ratio."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from oddsmodel.likelihood.base import Array

TIED = 1e-9
"""Two probabilities that differ by less, relatively, count as equal: their logs are right to some 13 digits."""


class Tilted:
    """A sum that has the value `observed + distance` with probability proportional to exp(log_weight + θ distance).

    distance (s,): ascending, zero at `place`; log_weight (s,): finite. At least two values. θ is a log odds ratio per
    unit of the distance.
    """

    def __init__(self, distance: Array, log_weight: Array, place: int) -> None:
        self._distance, self._log_weight, self._place = distance, log_weight, place
        self.at_first, self.at_last = place == 0, place == len(distance) - 1
        probability = np.exp(log_weight - log_weight.max())
        probability /= probability.sum()
        mean = float(probability @ distance)
        variance = float(probability @ (distance - mean) ** 2)
        self._centre, self._spread = -mean / variance, 1.0 / math.sqrt(variance)

    def estimate(self) -> float | None:
        """The θ at which the expected value is the observed one; None where it is the least or greatest possible."""
        if self.at_first or self.at_last:
            return None

        def excess(theta: float) -> float:
            weight = self._log_weight + theta * self._distance
            probability = np.exp(weight - weight.max())
            return float(probability @ self._distance) / float(probability.sum())

        return self._root(excess)

    def median_unbiased(self) -> float:
        """The middle of the θ at which P(T >= t) is 1/2 and the θ at which P(T <= t) is 1/2.

        Where t is the least or greatest possible value, only one of them exists, and is the estimate
        (Hirji, Tsiatis & Mehta 1989, American Statistician 43:7-11).
        """
        halves = [self.lower_limit(0.5, 1.0), self.upper_limit(0.5, 1.0)]
        found = [half for half in halves if half is not None]
        return sum(found) / len(found)

    def lower_limit(self, tail: float, share: float) -> float | None:
        """The θ at which P(T > t) + share·P(T = t) is `tail`; None where t is the least possible value."""
        if self.at_first:
            return None
        target = math.log(tail)
        return self._root(lambda theta: self._log_tail(theta, upper=True, share=share) - target)

    def upper_limit(self, tail: float, share: float) -> float | None:
        """The θ at which P(T < t) + share·P(T = t) is `tail`; None where t is the greatest possible value."""
        if self.at_last:
            return None
        target = math.log(tail)
        return self._root(lambda theta: target - self._log_tail(theta, upper=False, share=share))

    def p_doubled(self, share: float) -> float:
        """Twice the smaller tail at θ = 0, at most 1; `share` of the observed value's probability is in each tail."""
        smaller = min(self._log_tail(0.0, upper=side, share=share) for side in (True, False))
        return min(1.0, 2.0 * math.exp(smaller))

    def p_by_probability(self) -> float:
        """The probability at θ = 0 of all values that are no more probable than the observed one."""
        return p_no_more_probable(self._log_weight, self._place)

    def _log_tail(self, theta: float, *, upper: bool, share: float) -> float:
        weight = self._log_weight + theta * self._distance
        whole = _log_sum(weight)
        weight[self._place] += math.log(share)
        part = weight[self._place :] if upper else weight[: self._place + 1]
        return _log_sum(part) - whole

    def _root(self, rising: Callable[[float], float]) -> float:
        """The zero of a function that rises from negative to positive."""
        from scipy.optimize import brentq

        reach = 4.0 * self._spread
        lower, upper = self._centre - reach, self._centre + reach
        while rising(lower) > 0.0:
            reach *= 2.0
            lower -= reach
        while rising(upper) < 0.0:
            reach *= 2.0
            upper += reach
        smallest = 4.0 * np.finfo(float).eps
        return float(brentq(rising, lower, upper, xtol=1e-14 * self._spread, rtol=smallest, maxiter=500))


def p_no_more_probable(log_weight: Array, place: int) -> float:
    """The probability of all values that are no more probable than that at `place`."""
    few = log_weight <= log_weight[place] + TIED
    return min(1.0, math.exp(_log_sum(log_weight[few]) - _log_sum(log_weight)))


def _log_sum(logs: Array) -> float:
    """log of the sum of exponentials."""
    largest = float(logs.max())
    return largest + math.log(float(np.exp(logs - largest).sum()))
