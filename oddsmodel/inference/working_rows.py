"""The few rows on which the programs of a recession cone are solved, as floats and as whole numbers."""

from __future__ import annotations

from fractions import Fraction
from math import frexp

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import qr, svd

from oddsmodel.inference.cone_rows import Chosen
from oddsmodel.inference.rational import Signs, Whole, whole_row
from oddsmodel.likelihood.base import Array

Index = NDArray[np.intp]

DEPENDENT = 1e-9
"""Length of what is left of a row outside the span of others, relative to the longest, that counts as nothing."""

WELL_CONDITIONED = 1e-5
NOTHING = 1e-13


class WorkingRows:
    """Distinct rows X (m, p) with the signs that x'v must not contradict; sides of 0 ask for x'v = 0.

    numbers (m,) are those of the rows in their source; a row of number -1 is a condition that is no row of it.
    """

    def __init__(self, parameters: int) -> None:
        self.X: Array = np.zeros((0, parameters))
        self.sides: Signs = np.zeros(0, dtype=np.int8)
        self.numbers: NDArray[np.int64] = np.zeros(0, dtype=np.int64)
        self._seen: set[tuple[int, bytes]] = set()
        self._whole: list[tuple[Whole, Fraction]] = []

    def add(self, chosen: Chosen) -> bool:
        """Take up rows not yet here; whether there were any. Rows of zeros say nothing."""
        new = []
        for k, row in enumerate(chosen.X):
            known = (int(chosen.sides[k]), (row + 0.0).tobytes())
            if known not in self._seen and row.any():
                self._seen.add(known)
                new.append(k)
        self.X = np.concatenate([self.X, chosen.X[new]])
        self.sides = np.concatenate([self.sides, chosen.sides[new]])
        self.numbers = np.concatenate([self.numbers, chosen.numbers[new]])
        return bool(new)

    def whole(self, k: int) -> tuple[Whole, Fraction]:
        """Row k turned to its side, in whole numbers, with the positive factor by which it was multiplied."""
        while len(self._whole) <= k:
            row, side = self.X[len(self._whole)], int(self.sides[len(self._whole)])
            self._whole.append(whole_row(-row if side < 0 else row))
        return self._whole[k]

    @property
    def scale(self) -> Array:
        """The largest absolute value of each column (p,), 1 where it is zero."""
        largest = np.abs(self.X).max(axis=0, initial=0.0)
        return np.where(largest > 0.0, largest, 1.0)

    def power(self, j: int) -> Fraction:
        """A power of two of about the scale of column j."""
        return Fraction(2) ** min(max(frexp(self.scale[j])[1], -1000), 1000)


class UnitRows:
    """Working rows turned to their sides, in coordinates and lengths that suit floating point.

    rows (m, q) = side * X / scale @ turn / length[:, None], of largest entry one; v = turn u / scale.
    """

    def __init__(self, working: WorkingRows, basis: Array | None = None) -> None:
        """basis (p, q): of a space in the columns divided by their scale; None for all of it, turned where needed."""
        self.scale = working.scale
        sides = np.where(working.sides < 0, -1.0, 1.0)
        rows = (sides[:, None] * working.X / self.scale).astype(np.longdouble)
        self.turn = basis if basis is not None else _turn(np.asarray(rows, dtype=np.float64))
        if self.turn is not None:
            rows = rows @ self.turn.astype(np.longdouble)
        length = np.abs(rows).max(axis=1, initial=0.0)
        self.length = np.where(length > 0.0, length, 1.0)
        self.rows = np.asarray(rows / self.length[:, None], dtype=np.float64)

    def direction(self, point: Array) -> Array:
        """The direction of the coefficients (p,) of a point (q,), infinite where floats do not reach so far."""
        turned = point if self.turn is None else self.turn @ point
        with np.errstate(over="ignore"):
            return np.asarray(turned / self.scale)


def _turn(rows: Array) -> Array | None:
    """Coordinates in which ill-conditioned rows fill all directions alike; None where they do so as they are."""
    if rows.shape[0] == 0:
        return None
    known, axes = _axes(rows)
    if known[-1] > WELL_CONDITIONED * known[0] or known[0] == 0.0:
        return None
    return np.asarray(axes.T / np.where(known > NOTHING * known[0], known / known[0], 1.0))


def independent(rows: Array) -> Index:
    """Rows (m, q) that span the others, to working precision, by a factorisation with pivots."""
    if rows.size == 0:
        return np.zeros(0, dtype=np.intp)
    r, order = qr(rows.T, mode="r", pivoting=True)
    sizes = np.abs(np.diag(r))
    return np.asarray(order[: int(np.sum(sizes > DEPENDENT * sizes[0]))], dtype=np.intp)


def null_space(rows: Array) -> Array:
    """An orthonormal basis (q, d) of the directions orthogonal to rows (m, q), to working precision."""
    if rows.shape[0] == 0:
        return np.eye(rows.shape[1])
    sizes, axes = _axes(rows)
    return np.asarray(axes[int(np.sum(sizes > DEPENDENT * sizes[0])) :].T)


def _axes(rows: Array) -> tuple[Array, Array]:
    """Singular values (q,), largest first, and the axes (q, q) of rows (m, q)."""
    triangle = np.linalg.qr(rows, mode="r")
    _, sizes, axes = svd(triangle, full_matrices=True)
    return np.concatenate([sizes, np.zeros(rows.shape[1] - sizes.size)]), axes
