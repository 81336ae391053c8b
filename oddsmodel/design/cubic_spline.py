"""Cubic regression splines (Wood 2006, section 4.1.2): the bases of cr(x, ...) and of the cyclic cc(x, ...)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.design.factors import CubicSpline
from oddsmodel.design.reading import Array
from oddsmodel.design.weighted import weighted_quantiles


@dataclass(frozen=True)
class CubicBasis:
    """knots (k,): rising. curvature: the map from values at the knots to second derivatives there.

    Column j is the spline that is 1 at knot j and 0 at the others. kept (columns, width): a change of basis under
    which the columns sum to 0 over the training records; None without that constraint. Beyond the outermost knots
    the natural spline goes on as a straight line; the cyclic one repeats.
    """

    knots: Array
    cyclic: bool
    curvature: Array
    kept: Array | None = None

    @property
    def width(self) -> int:
        return int(self.curvature.shape[0] if self.kept is None else self.kept.shape[1])

    def __call__(self, x: Array) -> Array:
        """The columns (n, width) at x (n,)."""
        free = self._free(x)
        return free if self.kept is None else np.asarray(free @ self.kept)

    def _free(self, x: Array) -> Array:
        knots = self.knots
        lower, upper = knots[0], knots[-1]
        if self.cyclic:
            x = np.where((x < lower) | (x > upper), lower + np.mod(x - lower, upper - lower), x)
        j = np.clip(np.searchsorted(knots, x) - 1, 0, knots.size - 2)
        after = (j + 1) % self.curvature.shape[0]
        h = (knots[1:] - knots[:-1])[j]
        to_next, from_last = knots[j + 1] - x, x - knots[j]
        bend_left = np.where(x > upper, 0.0, to_next**3 / h) / 6.0 - h * to_next / 6.0
        bend_right = np.where(x < lower, 0.0, from_last**3 / h) / 6.0 - h * from_last / 6.0
        columns = self.curvature[j] * bend_left[:, np.newaxis]
        columns += self.curvature[after] * bend_right[:, np.newaxis]
        rows = np.arange(x.size)
        columns[rows, j] += to_next / h
        columns[rows, after] += from_last / h
        return columns


def cubic_spline(factor: CubicSpline, x: Array, counts: Array | None) -> CubicBasis | None:
    """The basis with the knots that the training values x (n,) give; None where there are too few different values.

    Inner knots not given lie at evenly spaced quantiles of the different values of x. counts: true frequencies, for
    the constraint that the columns sum to 0.
    """
    different = np.unique(x)
    if factor.knots is not None:
        inner = np.array(factor.knots)
    else:
        number = (factor.df or 0) - 2 + factor.centred + factor.cyclic
        inner = weighted_quantiles(different, np.linspace(0.0, 1.0, number + 2)[1:-1])
    knots = np.concatenate((different[:1], inner, different[-1:]))
    if (np.diff(knots) <= 0).any():
        return None
    basis = CubicBasis(knots, factor.cyclic, _cyclic(knots) if factor.cyclic else _natural(knots))
    if not factor.centred:
        return basis
    means = np.average(basis(x), axis=0, weights=counts)
    orthogonal = np.linalg.qr(means[:, np.newaxis], mode="complete")[0]
    return CubicBasis(knots, factor.cyclic, basis.curvature, orthogonal[:, 1:])


def _natural(knots: Array) -> Array:
    """Second derivatives (k, k) at the knots of the natural splines through unit values: B F = D, 0 at the ends."""
    h, inner = np.diff(knots), knots.size - 2
    at = np.arange(inner)
    d = np.zeros((inner, knots.size))
    d[at, at], d[at, at + 2] = 1.0 / h[:-1], 1.0 / h[1:]
    d[at, at + 1] = -d[at, at] - d[at, at + 2]
    b = np.diag((h[:-1] + h[1:]) / 3.0) + np.diag(h[1:-1] / 6.0, 1) + np.diag(h[1:-1] / 6.0, -1)
    return np.vstack((np.zeros(knots.size), np.linalg.solve(b, d), np.zeros(knots.size)))


def _cyclic(knots: Array) -> Array:
    """Second derivatives (k − 1, k − 1) at the knots of the cyclic spline, whose last knot is its first."""
    h = np.diff(knots)
    before = np.roll(h, 1)
    at, last = np.arange(h.size), np.arange(h.size) - 1
    b, d = np.zeros((h.size, h.size)), np.zeros((h.size, h.size))
    b[at, at] = (before + h) / 3.0
    d[at, at] = -1.0 / before - 1.0 / h
    np.add.at(b, (at, last), before / 6.0)
    np.add.at(b, (last, at), before / 6.0)
    np.add.at(d, (at, last), 1.0 / before)
    np.add.at(d, (last, at), 1.0 / before)
    return np.asarray(np.linalg.solve(b, d))
