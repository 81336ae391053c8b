"""B-splines (de Boor 1978): the basis of bs(x, ...)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.design.factors import BasisSpline
from oddsmodel.design.reading import Array
from oddsmodel.design.weighted import weighted_quantiles

CUBIC = 3


@dataclass(frozen=True)
class BSplineBasis:
    """knots: all knots, the outermost repeated degree + 1 times. ends (2, width): the slopes at the outermost knots.

    The first basis function is left out, so that the columns do not span the intercept. Beyond the outermost knots
    each column goes on as a straight line (as a constant where the degree is 0).
    """

    knots: Array
    degree: int
    ends: Array

    @property
    def width(self) -> int:
        return int(self.knots.size) - self.degree - 2

    def __call__(self, x: Array) -> Array:
        """The columns (n, width) at x (n,)."""
        lower, upper = self.knots[0], self.knots[-1]
        inside = np.clip(x, lower, upper)
        columns = _basis(inside, self.knots, self.degree)[:, 1:]
        beyond = np.flatnonzero(inside != x)
        if beyond.size:
            slopes = self.ends[(x[beyond] > upper).astype(np.intp)]
            columns[beyond] += (x[beyond] - inside[beyond])[:, np.newaxis] * slopes
        return columns


def basis_spline(factor: BasisSpline, x: Array, counts: Array | None) -> BSplineBasis | None:
    """The basis with the knots that the training values x (n,) give; None where knots fall together.

    df columns take df − degree inner knots, at evenly spaced quantiles of x (counts: true frequencies); the outer
    knots are the smallest and the largest value.
    """
    degree = CUBIC if factor.degree is None else factor.degree
    if factor.knots is not None:
        inner = np.array(factor.knots)
    else:
        shares = np.linspace(0.0, 1.0, (factor.df or 0) - degree + 2)[1:-1]
        inner = weighted_quantiles(x, shares, counts)
    lower, upper = float(x.min()), float(x.max())
    distinct = np.concatenate(([lower], inner, [upper]))
    if (np.diff(distinct) <= 0).any():
        return None
    knots = np.concatenate(([lower] * (degree + 1), inner, [upper] * (degree + 1)))
    return BSplineBasis(knots, degree, _slopes(np.array([lower, upper]), knots, degree)[:, 1:])


def _basis(x: Array, knots: Array, degree: int) -> Array:
    """All basis functions (n, len(knots) − degree − 1) at x (n,) within the outermost knots.

    B_{j,0} = 1 on [t_j, t_{j+1}), the last interval closed;
    B_{j,d}(x) = (x − t_j) / (t_{j+d} − t_j) B_{j,d−1}(x) + (t_{j+d+1} − x) / (t_{j+d+1} − t_{j+1}) B_{j+1,d−1}(x).
    """
    last = knots.size - degree - 2
    interval = np.clip(np.searchsorted(knots, x, side="right") - 1, degree, last)
    local = np.ones((1, x.size))
    for d in range(1, degree + 1):
        wider = np.zeros((d + 1, x.size))
        for r in range(d):
            left, right = knots[interval - d + r + 1], knots[interval + r + 1]
            share = local[r] / (right - left)
            wider[r] += (right - x) * share
            wider[r + 1] += (x - left) * share
        local = wider
    basis = np.zeros((x.size, last + 1))
    rows = np.arange(x.size)
    for r in range(degree + 1):
        basis[rows, interval - degree + r] = local[r]
    return basis


def _slopes(x: Array, knots: Array, degree: int) -> Array:
    """First derivatives of all basis functions at x: B'_{j,d} = d (B_{j,d−1}/(t_{j+d} − t_j) − B_{j+1,d−1}/(...))."""
    width = knots.size - degree - 1
    if degree == 0:
        return np.zeros((x.size, width))
    lower = _basis(x, knots[1:-1], degree - 1)
    spans = knots[degree + 1 : degree + width] - knots[1:width]
    scaled = degree * lower / spans
    slopes = np.zeros((x.size, width))
    slopes[:, 1:] += scaled
    slopes[:, :-1] -= scaled
    return slopes
