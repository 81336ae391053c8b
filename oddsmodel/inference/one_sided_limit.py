"""How far an estimate that has no finite value reaches down: its one-sided profile-likelihood limit."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.linalg import null_space
from scipy.special import chdtri

from oddsmodel.inference.contrast_signs import Kind
from oddsmodel.inference.finite_part import FinitePart, kept_rows
from oddsmodel.inference.maximise import Problem, maximise_all
from oddsmodel.inference.recession_cone import RecessionCone, single_threaded
from oddsmodel.inference.separation import Separation
from oddsmodel.likelihood.base import Array
from oddsmodel.likelihood.binomial import BinomialLikelihood

MOST_STEPS = 60
SETTLED = 1e-10
"""Distance from the limit, in units of log-likelihood, at which the step just taken is the last."""


@dataclass(frozen=True)
class OneSidedLimit:
    """The limit of one contrast on the log-odds scale.

    kind: where the contrast goes. status: "at or above" with a limit below which the profile log-likelihood is more
    than q/2 short of its supremum (kind "plus infinity"), "at or below" likewise ("minus infinity"); "flat" where
    the profile log-likelihood has its supremum at every value ("undetermined"), "two-sided" where the contrast is
    finite, "not found" where a refit did not settle. limit: None but for the first two.
    """

    kind: Kind
    status: Literal["at or above", "at or below", "flat", "two-sided", "not found"]
    limit: float | None


def one_sided_limits(
    likelihood: BinomialLikelihood,
    verdict: Separation,
    part: FinitePart,
    contrasts: Array | None = None,
    level: float = 0.95,
) -> list[OneSidedLimit]:
    """The one-sided limits of contrasts (k, p), of each coefficient where None.

    The profile log-likelihood of a contrast theta = c'beta that goes to plus infinity rises to the supremum without
    reaching it. The limit is the theta at which it is q/2 below, q the chi-square quantile on one degree of freedom
    at `level`: the limit that a two-sided interval would have on that side.

    At a fixed theta, rows are again separated by the directions of the cone with c'v = 0. They rise to zero for every
    theta, so that the profile is that of the other rows, on which c'beta is identified (else there were directions of
    the cone either way) and the maximum at fixed theta is attained. It is concave and increasing: Newton's steps from
    the left of the limit, with the slope from the score, never pass it.

    Raises ValueError where level is not between 0 and 1.
    """
    if not 0.0 < level < 1.0:
        raise ValueError("level must lie between 0 and 1")
    rows = np.eye(likelihood.parameters) if contrasts is None else np.atleast_2d(np.asarray(contrasts, np.float64))
    kinds: Sequence[Kind] = verdict.coefficients if contrasts is None else [k.kind for k in verdict.contrasts(rows)]
    found = []
    for c, kind in zip(rows, kinds, strict=True):
        if kind == "finite":
            found.append(OneSidedLimit(kind, "two-sided", None))
        elif kind == "undetermined":
            found.append(OneSidedLimit(kind, "flat", None))
        else:
            sign = 1.0 if kind == "plus infinity" else -1.0
            drop = 0.5 * float(chdtri(1, 1.0 - level))
            limit = None
            if part.log_likelihood is not None:
                limit = _limit(likelihood, verdict, sign * c, part.log_likelihood - drop)
            if limit is None:
                found.append(OneSidedLimit(kind, "not found", None))
            else:
                found.append(OneSidedLimit(kind, "at or above" if sign > 0 else "at or below", sign * limit))
    return found


def _limit(likelihood: BinomialLikelihood, verdict: Separation, c: Array, height: float) -> float | None:
    """The theta = c'beta at which the profile, which rises in theta, reaches a height."""
    with single_threaded():
        cone = RecessionCone(verdict.cone.passes, likelihood.parameters, conditions=c[None, :])
    kept, columns = kept_rows(likelihood, cone)
    profile = _Profile(kept, c[list(columns)])
    theta, step = 0.0, 0.0
    right: float | None = None
    for _ in range(MOST_STEPS):
        there = profile.at(theta)
        if there is None:
            if right is None:
                return None
            # too far to the left for a refit from here
            theta = 0.5 * (theta + right)
            continue
        value, slope, spread = there
        short = height - value
        if abs(short) <= SETTLED and slope > 0.0:
            return theta + short / slope
        if short > 0.0:
            if not slope > 0.0:
                return None
            theta += short / slope
            continue
        # right of the limit, where the profile may be level: the tangent leads to its left, or too far
        right, step = theta, 2.0 * step or spread
        theta -= min(step, -short / slope) if slope > 0.0 else step
    return None


class _Profile:
    """The log-likelihood maximised at fixed c'beta, over rows on which the maximum is attained."""

    def __init__(self, likelihood: BinomialLikelihood, c: Array) -> None:
        self.likelihood, self.c = likelihood, c
        self.along = c / float(c @ c)
        self.basis = null_space(c[None, :])
        self.warm: Array = np.zeros(c.size)

    def at(self, theta: float) -> tuple[float, float, float] | None:
        """Value, slope and the standard error that the curvature gives at theta; None where it is not found."""
        start = self.warm + (theta - float(self.c @ self.warm)) * self.along
        for begin in (start, theta * self.along):
            fit = maximise_all(self.likelihood, [Problem(self.basis, theta * self.along, begin)])[0]
            if fit.status == "converged":
                break
        else:
            return None
        self.warm = fit.coefficients
        score = self.likelihood.evaluate(self.warm[None, :], information=False).score[0]
        solved = np.linalg.lstsq(fit.information, self.c, rcond=None)[0]
        spread = float(np.sqrt(max(float(self.c @ solved), 0.0)))
        return fit.log_likelihood, float(score @ self.along), spread or 1.0
