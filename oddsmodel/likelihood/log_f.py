"""A likelihood with log-F(m, m) priors for some odds ratios, in closed form."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array, Evaluation, Likelihood
from oddsmodel.likelihood.logistic import logistic


class LogFLikelihood:
    """log-likelihood + sum over the prior's coefficients of  (m/2) b - m log(1 + exp(b)),  b = per_j beta_j.

    That is the logarithm of a log-F(m, m) density of the log odds ratio b in the plan's unit and against its reference,
    constants left out (Greenland & Mansournia 2015, Statistics in Medicine 34:3133-3143, section 2): the same as m/2
    events and m/2 others among pseudo-records whose only column is the coefficient's, which so never reach any count
    or check. In other coordinates the prior stays on these log odds ratios. Concave.

    Which columns are linear combinations of others is judged on the rows alone: a prior could give such a column an
    estimate, but one that no record bears on.

    positions: of the coefficients; per: the unit of each (1 each where None).
    Raises ValueError for m not above 0 and finite, a unit that is 0 or not finite, units that are not one for each
    position, or a position that does not exist.
    """

    curvature: Literal["Hessian", "expected"] = "Hessian"
    concave = True

    def __init__(
        self, likelihood: Likelihood, positions: Sequence[int], m: float, per: Sequence[float] | None = None
    ) -> None:
        if not (0.0 < m < np.inf) or not all(0 <= position < likelihood.parameters for position in positions):
            raise ValueError("m must be above 0 and finite, and positions must be those of coefficients")
        units = np.ones(len(positions)) if per is None else np.asarray(per, dtype=np.float64)
        if units.shape != (len(positions),) or not ((units != 0.0) & np.isfinite(units)).all():
            raise ValueError("per must be one unit for each position, not 0 and finite")
        directions = np.zeros((len(positions), likelihood.parameters))
        directions[np.arange(len(positions)), list(positions)] = units
        self.likelihood, self.m, self.directions = likelihood, float(m), directions

    def _with(self, likelihood: Likelihood, directions: Array) -> LogFLikelihood:
        made = LogFLikelihood(likelihood, (), self.m)
        made.directions = directions
        return made

    @property
    def parameters(self) -> int:
        return self.likelihood.parameters

    @property
    def rows(self) -> int:
        return self.likelihood.rows

    def evaluate(self, beta: Array, *, member: NDArray[np.int64] | None = None, information: bool = True) -> Evaluation:
        points = np.atleast_2d(np.asarray(beta, dtype=np.float64))
        plain = self.likelihood.evaluate(points, member=member, information=information)
        b = points @ self.directions.T
        small, whole, share = logistic(b)
        normaliser = np.log1p(small) + np.maximum(b, 0.0)
        value = plain.log_likelihood + self.m * (0.5 * b - normaliser).sum(axis=1)
        score = plain.score + self.m * (0.5 - share) @ self.directions
        curvature = plain.information
        if curvature is not None:
            weight = self.m * small / (whole * whole)
            curvature = curvature + np.einsum("kj,ja,jb->kab", weight, self.directions, self.directions)
        return Evaluation(value, score, curvature)

    def gram(self) -> Array:
        return self.likelihood.gram()

    def transformed(self, basis: Array) -> LogFLikelihood:
        return self._with(self.likelihood.transformed(basis), self.directions @ basis)

    def thinned(self, leaves: int) -> LogFLikelihood:
        return self._with(self.likelihood.thinned(leaves), self.directions)

    def triangle(self) -> Array:
        return self.likelihood.triangle()

    def rows_apart(self) -> tuple[Array, Array, Array]:
        """The rows, and one with both outcomes for each prior: no direction that moves its odds ratio separates."""
        X, events, trials = self.likelihood.rows_apart()
        number = len(self.directions)
        return (
            np.vstack([X, self.directions]),
            np.concatenate([events, np.full(number, 0.5 * self.m)]),
            np.concatenate([trials, np.full(number, self.m)]),
        )

    def extended_score(self, beta: NDArray[np.longdouble]) -> NDArray[np.longdouble]:
        directions = self.directions.astype(np.longdouble)
        _, _, share = logistic(directions @ beta)
        return self.likelihood.extended_score(beta) + np.longdouble(self.m) * (np.longdouble(0.5) - share) @ directions


def prior_interval(m: float, level: float = 0.95) -> tuple[float, float]:
    """The odds ratios between which a log-F(m, m) prior lays the probability `level`: quantiles of F on m, m degrees.

    Greenland & Mansournia 2015, section 2. Raises ValueError where m is not above 0, level not between 0 and 1, or m so
    small that a quantile is beyond floating point.

    >>> lower, upper = prior_interval(2.0)
    >>> round(1.0 / lower, 6), round(upper, 6)
    (39.0, 39.0)
    """
    from scipy.special import betaincinv

    if not (m > 0.0 and 0.0 < level < 1.0):
        raise ValueError("m must be above 0 and level between 0 and 1")
    share = float(betaincinv(m / 2.0, m / 2.0, 0.5 - level / 2.0))
    if not share > 1e-300:
        raise ValueError("a prior of so small an m has no interval that could be written")
    return share / (1.0 - share), (1.0 - share) / share
