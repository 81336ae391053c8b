"""Fisher's noncentral hypergeometric distribution: one cell of a 2×2 table given its margins, in log space."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


class Conditional:
    """The distribution of cell a given the margins of the table a, b / c, d and the log odds ratio θ.

        P(x) ∝ C(a+b, x) C(c+d, a+c−x) exp(θ x),   x from max(0, a−d) to min(a+b, a+c)   (Fisher 1935; Cornfield 1956)

    The logs of the weights are summed outwards from the observed x = a, where ratios of neighbours are near 1 for
    the odds ratios that matter, so that large tables lose no digits to differences of large log-factorials.
    All methods work on the log-odds scale. The table must have no empty margin.
    """

    def __init__(self, a: int, b: int, c: int, d: int) -> None:
        exposed, unexposed, events = a + b, c + d, a + c
        first, last = max(0, a - d), min(exposed, events)
        self._at_first, self._at_last = a == first, a == last
        self._place = a - first
        self._distance = np.arange(first, last + 1, dtype=np.float64) - a

        # log P(x+1)/P(x) at θ = 0, for x from first to last - 1.
        x = np.arange(first, last, dtype=np.float64)
        step = np.log((exposed - x) / (x + 1.0) * ((events - x) / (unexposed - events + x + 1.0)))
        above = np.cumsum(step[self._place :])
        below = np.cumsum(-step[: self._place][::-1])[::-1]
        self._log_weight = np.concatenate([below, [0.0], above])

        self._centre = math.log((a + 0.5) * (d + 0.5) / ((b + 0.5) * (c + 0.5)))
        self._spread = math.sqrt(sum(1.0 / (cell + 0.5) for cell in (a, b, c, d)))

    def estimate(self) -> float:
        """The θ at which the expected value of the cell is its observed value. No cell may be zero."""

        def excess(theta: float) -> float:
            weight = self._log_weight + theta * self._distance
            probability = np.exp(weight - weight.max())
            return float(probability @ self._distance) / float(probability.sum())

        return self._root(excess)

    def lower_limit(self, tail: float, share: float) -> float | None:
        """The θ at which P(X > a) + share·P(X = a) is `tail`; None where the cell is the least possible."""
        if self._at_first:
            return None
        target = math.log(tail)
        return self._root(lambda theta: self._log_tail(theta, upper=True, share=share) - target)

    def upper_limit(self, tail: float, share: float) -> float | None:
        """The θ at which P(X < a) + share·P(X = a) is `tail`; None where the cell is the greatest possible."""
        if self._at_last:
            return None
        target = math.log(tail)
        return self._root(lambda theta: target - self._log_tail(theta, upper=False, share=share))

    def p(self, share: float) -> float:
        """Twice the smaller tail at θ = 0, at most 1; `share` of the observed table's probability is in each tail."""
        smaller = min(self._log_tail(0.0, upper=side, share=share) for side in (True, False))
        return min(1.0, 2.0 * math.exp(smaller))

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
        return float(brentq(rising, lower, upper, xtol=1e-14, rtol=4.0 * np.finfo(float).eps, maxiter=500))


def _log_sum(logs: Array) -> float:
    """log of the sum of exponentials."""
    largest = float(logs.max())
    return largest + math.log(float(np.exp(logs - largest).sum()))
