"""Coordinates in which the arithmetic is safe, and the columns that are linear combinations of others."""

from __future__ import annotations

from dataclasses import dataclass
from weakref import WeakKeyDictionary

import numpy as np
from scipy.linalg import qr, solve_triangular

from oddsmodel.likelihood.base import Array, Likelihood

WELL_CONDITIONED = 1e-7
"""Smallest eigenvalue of the scaled gram matrix above which the given columns serve as they are."""

RANK_TOLERANCE = 1e-11
"""A column whose part outside the span of the columns before it is smaller, relative to its length, is aliased."""


@dataclass(frozen=True, slots=True)
class Relation:
    """An aliased column written in the columns kept: X[:, column] = sum of weight[j] X[:, j]."""

    column: int
    weights: tuple[tuple[int, float], ...]


@dataclass(frozen=True)
class Coordinates:
    """Working coordinates gamma with beta = to_beta gamma; gamma = from_beta beta.

    Where the columns are well conditioned both are None and gamma is beta. Otherwise the working columns are
    nearly orthonormal: raw powers of a calendar year, say, are then no harder than any other columns.
    """

    working: Likelihood
    to_beta: Array | None
    from_beta: Array | None
    gram: Array
    aliased: tuple[Relation, ...] = ()

    def beta(self, gamma: Array) -> Array:
        """Coefficients (..., p) of working coordinates (..., p)."""
        return gamma if self.to_beta is None else gamma @ self.to_beta.T

    def gamma(self, beta: Array) -> Array:
        """Working coordinates (..., p) of coefficients (..., p)."""
        return beta if self.from_beta is None else beta @ self.from_beta.T


_known: WeakKeyDictionary[Likelihood, Coordinates] = WeakKeyDictionary()


def coordinates(likelihood: Likelihood) -> Coordinates:
    """The working coordinates of a likelihood; found once and kept as long as it lives."""
    if likelihood not in _known:
        _known[likelihood] = _find(likelihood)
    return _known[likelihood]


def _find(likelihood: Likelihood) -> Coordinates:
    gram = likelihood.gram()
    length = np.sqrt(np.diag(gram))
    if (length > 0).all():
        scaled = gram / np.outer(length, length)
        if float(np.linalg.eigvalsh(scaled)[0]) > WELL_CONDITIONED:
            return Coordinates(likelihood, None, None, gram)
    triangle = likelihood.triangle()
    relations = aliased_columns(triangle)
    if relations:
        return Coordinates(likelihood, None, None, gram, relations)
    # A column's mean is taken off by the triangle itself: the constant column, or the span that holds it, comes
    # with the others, and orthonormal columns are centred against it.
    identity = np.eye(triangle.shape[1])
    to_beta = solve_triangular(triangle, identity)
    working = likelihood.transformed(to_beta)
    return Coordinates(working, to_beta, triangle, working.gram())


def aliased_columns(triangle: Array) -> tuple[Relation, ...]:
    """Columns in the span of the columns before them, by a QR factorisation that keeps the given order.

    triangle (p, p): R of the matrix's QR factorisation. Every column is scaled to length one; a column is aliased
    when what is left of it outside the span of the kept ones is below 1e-11 of its length (and a zero column is).
    """
    length = np.sqrt((triangle**2).sum(axis=0))
    kept: list[int] = []
    relations: list[Relation] = []
    for column in range(triangle.shape[1]):
        if length[column] == 0.0:
            relations.append(Relation(column, ()))
            continue
        target = triangle[:, column] / length[column]
        if not kept:
            kept.append(column)
            continue
        basis = triangle[:, kept] / length[kept]
        q, r, order = qr(basis, mode="economic", pivoting=True)
        left = target - q @ (q.T @ target)
        left -= q @ (q.T @ left)
        if float(np.sqrt(left @ left)) > RANK_TOLERANCE:
            kept.append(column)
            continue
        solution = np.empty(len(kept))
        solution[order] = solve_triangular(r, q.T @ target)
        weights = solution * length[column] / length[kept]
        size = np.abs(solution)
        relations.append(
            Relation(
                column,
                tuple((kept[j], _tidied(float(weights[j]))) for j in range(len(kept)) if size[j] > 1e-7 * size.max()),
            )
        )
    return tuple(relations)


def _tidied(weight: float) -> float:
    """A weight that is a small fraction up to rounding, as that fraction."""
    for denominator in range(1, 13):
        nearest = round(weight * denominator) / denominator
        if nearest and abs(weight - nearest) < 1e-7 * max(1.0, abs(weight)):
            return nearest
    return weight
