"""Profile-likelihood limits of contrasts of the coefficients, all bounds side by side."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray
from scipy.special import chdtri

from oddsmodel.inference.maximise import Fit
from oddsmodel.inference.profile_search import search_limit
from oddsmodel.inference.profile_surface import Surface, ThinSurface, WholeSurface, thin_surface, whitening_root
from oddsmodel.likelihood.base import Array, Evaluation
from oddsmodel.passes.work import products

LimitStatus = Literal["found", "no finite limit", "not found"]

PRECISION = 1e-12
"""Bound on the error of a limit, in standard errors, at which its step is the last; see `_Search` for the estimate."""

SAFETY = 2.0
"""The estimated error is multiplied by this, beyond which it is some three times too large already."""

SLOW = 0.1
"""Steps that shrink by less than this, one to the next, are taken with the information of the present point."""

UNLIKE = 0.5
"""Informations from a part of the rows serve where they differ by no more from that at the maximum."""

WIDE = 30
"""With more columns two passes for the score cost less than the information at one of two bounds."""

FAR = 8.0
"""A point whose log-likelihood is below the maximum by so many quantiles is no place to take a step from."""

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

    whose fixed points are exactly the limits. All bounds step in the same passes; `_Search` says how, and when a
    step is the last. A bound whose steps do not settle is searched for by refitting at fixed theta between
    brackets, which cannot fail on a concave likelihood. A bound is settled only next to a point on the right side,
    at the right height and stationary on its slice, which on a concave likelihood makes it the limit.

    told: called with the number of bounds settled in each round.
    Raises ValueError where the fit has not converged on the whole space or level is not between 0 and 1.
    """
    if fit.status != "converged" or fit.dimension != fit.coefficients.size:
        raise ValueError("profile limits need a converged fit of all coefficients")
    if not 0.0 < level < 1.0:
        raise ValueError("level must lie between 0 and 1")
    search = _Search(fit, np.atleast_2d(np.asarray(contrasts, dtype=np.float64)), float(chdtri(1, 1.0 - level)))
    with products().limit(limits=1, user_api="blas"):
        # many small matrices: threads would cost more than they do, and could change the last bits
        search.run(told)
    return search.limits()


class _Search:
    """All bounds of one fit: bound 2j is the lower one of contrast j, bound 2j + 1 its upper one.

    Steps are taken in coordinates u in which the information at the maximum is the identity, so that lengths are in
    standard errors, theta is `centre + standard error * (a'u)` with a of length one, and the quadratic approximation
    of a limit is sqrt(q) a.

    *Few informations.* A step needs the information only to some digits: with one whose relative error is r, a point
    that is e from the limit comes to within r e of it, and its theta, which is stationary on the slice, to within
    r e^2. So the information is worked out once, at the quadratic approximations, and later passes ask for the
    score alone. Where rows are many that first step is taken on an approximate surface from a part of the rows
    (`ThinSurface`). The information of a lower bound is that of the upper one mirrored, 2 - I(u) for I(-u), which is
    right to the third derivatives of the log-likelihood. Where columns are many an information costs more than
    several scores, and that of the maximum serves as long as steps shrink fast.

    *The last step.* The length of a step is the error e of the point it leaves, and r is at most about the ratio of
    that length to the length of the step before. A bound is settled when 2 r e^2 is at most 1e-12 standard errors,
    or what rounding of the log-likelihood leaves of them. Before any step of the whole rows, r is e over half the
    way from the maximum, since an information that misses the score at the end of the way by e is itself off there
    by 2 e over its length.
    """

    def __init__(self, fit: Fit, contrasts: Array, quantile: float) -> None:
        space, bounds = fit.space, 2 * len(contrasts)
        self.fit, self.quantile = fit, quantile
        self.height = fit.log_likelihood - 0.5 * quantile
        self.tolerance = max(PRECISION, 0.5 * float(np.finfo(float).eps) * abs(fit.log_likelihood))
        self.root = root = whitening_root(fit.working_information)
        self.whole = WholeSurface(space.working, fit.working, root)
        self.contrast = np.repeat(contrasts if space.to_beta is None else contrasts @ space.to_beta, 2, axis=0)
        self.sign = np.tile([-1.0, 1.0], len(contrasts))
        self.centre = self.contrast @ fit.working
        inward = self.contrast @ root
        self.standard_error = np.sqrt((inward**2).sum(axis=1))
        self.direction = inward / self.standard_error[:, None]
        self.point = np.sqrt(quantile) * self.sign[:, None] * self.direction
        self.before = np.zeros_like(self.point)
        self.length = np.full(bounds, 0.5 * np.sqrt(quantile))
        self.inverse = np.tile(np.eye(root.shape[1]), (bounds, 1, 1))
        self.informed = np.zeros(bounds, dtype=bool)
        self.left = np.full(bounds, MOST_STEPS)
        self.theta = np.full(bounds, np.nan)
        self.status: list[LimitStatus] = ["not found"] * bounds

    def run(self, told: Callable[[int], None] | None) -> None:
        """Step all bounds together; then search singly for those that did not settle."""
        if self.fit.space.working.curvature == "Hessian":
            thin = thin_surface(self.fit, self.root)
            if thin is None and self.root.shape[1] > WIDE:
                self.informed[:] = True
            else:
                self._begin(thin)
        active = np.arange(self.sign.size)
        while active.size:
            ready = self.informed[active]
            left = [self._round(group) for group in (active[ready], active[~ready]) if group.size]
            if told is not None:
                told(active.size - sum(group.size for group in left))
            active = np.concatenate(left)
        for bound in np.flatnonzero(np.isnan(self.theta)).tolist():
            self._search(bound)

    def _begin(self, thin: ThinSurface | None) -> None:
        """The first step of all bounds, on the part of the rows where there is one."""
        surface: Surface = self.whole if thin is None else thin
        lower, upper = np.arange(0, self.sign.size, 2), np.arange(1, self.sign.size, 2)
        above = surface.evaluate(self.point[upper], information=True)
        below = surface.evaluate(self.point[lower], information=False)
        assert above.information is not None
        identity = np.eye(self.root.shape[1])
        change = above.information - identity
        size = np.sqrt((change**2).sum(axis=(1, 2)))
        self.inverse[upper] = _inverse(above.information)
        self.inverse[lower] = _inverse(np.where((size < 1.0)[:, None, None], identity - change, identity))
        for group, found, error in ((upper, above, 0.0 * size), (lower, below, size**2)):
            step, sound, near = self._steps(group, found)
            length = _length(step)
            taken = sound & near & (error <= SLOW if thin is None else size <= UNLIKE)
            self.point[group[taken]] += step[taken]
            # beyond the step's start the information changes on as it did on the way there
            self.informed[group] = taken & (error + size * length / np.sqrt(self.quantile) <= SLOW)
            if thin is None:
                self.length[group[taken]] = length[taken]

    def _round(self, group: NDArray[np.intp]) -> NDArray[np.intp]:
        """A step of some bounds, with the informations they have or with those of their points; the bounds left."""
        fresh = not self.informed[group].all()
        found = self.whole.evaluate(self.point[group], information=fresh)
        if found.information is not None:
            self.inverse[group] = _inverse(found.information)
        step, sound, near = self._steps(group, found)
        self.left[group] -= 1
        back = group[~near]
        self.point[back] = 0.5 * (self.point[back] + self.before[back])
        self.length[back] = 0.5 * np.sqrt(self.quantile)
        self.informed[group[~(near & sound)]] = False
        if fresh:
            self.left[group[near & ~sound]] = 0
        step, group, rest = step[near & sound], group[near & sound], group[~(near & sound)]
        length = _length(step)
        ratio = length / np.maximum(self.length[group], np.finfo(float).tiny)
        self.before[group] = self.point[group]
        self.point[group] += step
        self.length[group] = length
        self.informed[group] = (ratio <= SLOW) & (self.fit.space.working.curvature == "Hessian")
        beyond = (self.direction[group] * self.point[group]).sum(axis=1)
        settled = (SAFETY * ratio * length**2 <= self.tolerance) & (self.sign[group] * beyond > 0.0)
        done = group[settled]
        self.theta[done] = self.centre[done] + self.standard_error[done] * beyond[settled]
        for bound in done.tolist():
            self.status[bound] = "found"
        going = np.concatenate([group[~settled], rest])
        return np.asarray(going[self.left[going] > 0])

    def _steps(self, group: NDArray[np.intp], found: Evaluation) -> tuple[Array, NDArray[np.bool_], NDArray[np.bool_]]:
        """The steps d of some bounds, which of them exist, and which start near enough to the limit to be taken."""
        a, value = self.direction[group], found.log_likelihood
        with np.errstate(all="ignore"):
            pull = np.einsum("kij,kj->ki", self.inverse[group], found.score)
            across = np.einsum("kij,kj->ki", self.inverse[group], a)
            along = (a * across).sum(axis=1)
            square = (2.0 * (value - self.height) + (found.score * pull).sum(axis=1)) / along
            step = pull + (self.sign[group] * np.sqrt(square))[:, None] * across
        sound = (along > 0.0) & (square >= 0.0) & np.isfinite(step).all(axis=1)
        return step, sound, value > self.fit.log_likelihood - FAR * self.quantile

    def _search(self, bound: int) -> None:
        """Search one bound by refitting at fixed theta."""
        self.theta[bound], self.status[bound] = search_limit(
            self.fit,
            self.contrast[bound],
            float(self.sign[bound]),
            self.height,
            float(self.standard_error[bound]) * np.sqrt(self.quantile),
        )

    def limits(self) -> ProfileLimits:
        theta = self.theta.reshape(-1, 2)
        return ProfileLimits(theta[:, 0], theta[:, 1], tuple(self.status[0::2]), tuple(self.status[1::2]))


def _length(step: Array) -> Array:
    return np.asarray(np.sqrt((step**2).sum(axis=1)))


def _inverse(matrices: Array) -> Array:
    """Inverses of symmetric matrices (k, r, r); generalised ones where any is singular."""
    try:
        return np.asarray(np.linalg.inv(matrices), dtype=np.float64)
    except np.linalg.LinAlgError:
        return np.asarray(np.linalg.pinv(np.nan_to_num(matrices), hermitian=True), dtype=np.float64)
