"""Profile-likelihood limits of contrasts of the coefficients, all bounds side by side."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.special import chdtri

from oddsmodel.inference.maximise import Fit
from oddsmodel.inference.profile_search import search_limit
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.base import Array

LimitStatus = Literal["found", "no finite limit", "not found"]

SETTLED = 1e-9
"""Distance from the limit, in units of log-likelihood, at which the next step is the last."""

MOST_STEPS = 25


@dataclass(frozen=True)
class ProfileLimits:
    """Limits (k,) of k contrasts on the log-odds scale, with a status each; -inf or +inf where none exists."""

    lower: Array
    upper: Array
    lower_status: tuple[LimitStatus, ...]
    upper_status: tuple[LimitStatus, ...]


def profile_intervals(fit: Fit, level: float = 0.95) -> tuple[Array, Array]:
    """Profile-likelihood limits (p,), (p,) of every coefficient, on the log-odds scale."""
    limits = profile(fit, np.eye(fit.coefficients.size), level)
    return limits.lower, limits.upper


def profile(
    fit: Fit, contrasts: Array, level: float = 0.95, *, told: Callable[[int], None] | None = None
) -> ProfileLimits:
    """Profile-likelihood limits of the contrasts c'beta, the rows of `contrasts` (k, p).

    A limit is the extreme theta = c'beta at which the log-likelihood, maximised over all beta with c'beta = theta,
    is l_max - q/2, q the chi-square quantile on one degree of freedom. There the score is a multiple of c. The
    step of Venzon & Moolgavkar (1988, Applied Statistics 37:87-94, equations 5 to 8) in Lagrange form, from score
    s and information I at the present point:

        d = I^-1 (s - m c),    m^2 = (2 (l - l_limit) + s'I^-1 s) / c'I^-1 c,    m < 0 for an upper limit,

    whose fixed points are exactly the limits. All bounds step in the same passes, from the quadratic
    approximation at the maximum. A bound whose steps do not settle is searched for by refitting at fixed theta
    between brackets, which cannot fail on a concave likelihood. A bound is settled only at a point on the right
    side, at the right height and stationary on its slice, which on a concave likelihood makes it the limit.

    told: called with the number of bounds settled in each round.
    Raises ValueError where the fit has not converged on the whole space or level is not between 0 and 1.
    """
    if fit.status != "converged" or fit.dimension != fit.coefficients.size:
        raise ValueError("profile limits need a converged fit of all coefficients")
    if not 0.0 < level < 1.0:
        raise ValueError("level must lie between 0 and 1")
    search = _Search(fit, np.atleast_2d(np.asarray(contrasts, dtype=np.float64)), float(chdtri(1, 1.0 - level)))
    search.run(told)
    return search.limits()


class _Search:
    """All bounds of one fit: bound 2j is the lower one of contrast j, bound 2j + 1 its upper one."""

    def __init__(self, fit: Fit, contrasts: Array, quantile: float) -> None:
        space = fit.space
        self.fit, self.quantile = fit, quantile
        self.height = fit.log_likelihood - 0.5 * quantile
        working = contrasts if space.to_beta is None else contrasts @ space.to_beta
        self.contrast = np.repeat(working, 2, axis=0)
        self.sign = np.tile([-1.0, 1.0], contrasts.shape[0])
        spread = solve(fit.working_information, working.T).T
        size = np.sqrt((spread * working).sum(axis=1))
        self.centre = self.contrast @ fit.working
        self.standard_error = np.repeat(size, 2)
        outward = np.repeat(spread / size[:, None], 2, axis=0) * self.sign[:, None]
        self.point = fit.working + np.sqrt(quantile) * outward
        self.theta = np.full(self.sign.size, np.nan)
        self.status: list[LimitStatus] = ["not found"] * self.sign.size

    def run(self, told: Callable[[int], None] | None) -> None:
        """Step all bounds together; then search singly for those that did not settle."""
        active = np.arange(self.sign.size)
        steps_left = np.full(self.sign.size, MOST_STEPS)
        previous = np.repeat(self.fit.working[None, :], self.sign.size, axis=0)
        single: list[int] = []
        while active.size:
            evaluation = self.fit.space.working.evaluate(self.point[active])
            going: list[int] = []
            for k, bound in enumerate(active.tolist()):
                value = float(evaluation.log_likelihood[k])
                information = evaluation.information[k] if evaluation.information is not None else np.eye(0)
                steps_left[bound] -= 1
                if not value > self.fit.log_likelihood - 8.0 * self.quantile:
                    # far beyond the limit, where the quadratic approximation says nothing: come back
                    self.point[bound] = 0.5 * (self.point[bound] + previous[bound])
                    (going if steps_left[bound] > 0 else single).append(bound)
                    continue
                step, distance = self._step(bound, value, evaluation.score[k], information)
                previous[bound] = self.point[bound]
                if step is None or steps_left[bound] <= 0:
                    single.append(bound)
                    continue
                self.point[bound] = self.point[bound] + step
                if distance <= SETTLED and self._side(bound):
                    self.theta[bound] = self.contrast[bound] @ self.point[bound]
                    self.status[bound] = "found"
                    continue
                going.append(bound)
            if told is not None:
                told(int(active.size) - len(going))
            active = np.array(going, dtype=int)
        for left in single:
            self._search(left)

    def _side(self, bound: int) -> bool:
        return bool(self.sign[bound] * (self.contrast[bound] @ self.point[bound] - self.centre[bound]) > 0.0)

    def _step(self, bound: int, value: float, score: Array, information: Array) -> tuple[Array | None, float]:
        """The step, and how far the present point is from the limit in units of log-likelihood."""
        c = self.contrast[bound]
        both = solve(information, np.column_stack([score, c]))
        along = float(c @ both[:, 1])
        square = (2.0 * (value - self.height) + float(score @ both[:, 0])) / along if along > 0 else -1.0
        if not (np.isfinite(square) and square >= 0.0):
            return None, np.inf
        multiplier = -self.sign[bound] * np.sqrt(square)
        lagrange = float(c @ both[:, 0]) / along
        off = both[:, 0] - lagrange * both[:, 1]
        distance = abs(value - self.height) + 0.5 * max(0.0, float(off @ (score - lagrange * c)))
        return both[:, 0] - multiplier * both[:, 1], distance

    def _search(self, bound: int) -> None:
        """Search one bound by refitting at fixed theta."""
        theta, status = search_limit(
            self.fit,
            self.contrast[bound],
            float(self.sign[bound]),
            self.height,
            float(self.standard_error[bound]) * np.sqrt(self.quantile),
        )
        self.theta[bound] = theta
        self.status[bound] = status

    def limits(self) -> ProfileLimits:
        theta = self.theta.reshape(-1, 2)
        return ProfileLimits(theta[:, 0], theta[:, 1], tuple(self.status[0::2]), tuple(self.status[1::2]))
