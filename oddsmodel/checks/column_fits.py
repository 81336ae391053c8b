"""Models that each take some of the columns of one matrix: their maxima side by side, in shared passes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from oddsmodel.checks.nearby import Known, maxima_near
from oddsmodel.inference.maximise import maximise
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.fitted import Array
from oddsmodel.passes import Leaf


@dataclass(frozen=True, slots=True)
class Columns:
    """Makes rows with some of the columns of the matrix."""

    kept: tuple[int, ...]

    def __call__(self, rows: Leaf) -> Leaf:
        return {**rows, "X": rows["X"].take(self.kept, axis=1)}


@dataclass(frozen=True, eq=False)
class ColumnFit:
    """The maximum with the coefficients of some columns free and those of the others 0.

    coefficients (q,): of all columns. finite: whether there is a maximum; where there is none log_likelihood is the
    supremum, and the coefficients are no estimate. covariance (q, q): 0 off the columns; None until it is asked for.
    """

    columns: tuple[int, ...]
    coefficients: Array
    log_likelihood: float
    finite: bool = True
    covariance: Array | None = None


def known_at(likelihood: BinomialLikelihood, point: Array) -> Known:
    """What one pass tells of a likelihood at a point (q,)."""
    found = likelihood.evaluate(point)
    assert found.information is not None
    return Known(point, found.score[0], found.information[0])


def column_fits(
    likelihood: BinomialLikelihood, known: Known, wanted: Sequence[Sequence[int]]
) -> list[ColumnFit | None]:
    """The maximum over each set of columns, sought from a known point (q,) that is near all of them.

    The matrix as a whole may be singular; the columns of one set must be independent. What is not found from there is
    sought from the best maximum that was, and what cannot be found in the shared passes is maximised alone, which also
    decides whether its maximum is finite. None where that does not settle.
    """
    found = _near(likelihood, known, wanted)
    best = max((one for one in found if one is not None), key=lambda one: one.log_likelihood, default=None)
    if best is not None and any(one is None for one in found):
        lost = [columns for columns, one in zip(wanted, found, strict=True) if one is None]
        again = iter(_near(likelihood, known_at(likelihood, best.coefficients), lost))
        found = [next(again) if one is None else one for one in found]
    return [
        _alone(likelihood, known.point, tuple(columns)) if one is None else one
        for columns, one in zip(wanted, found, strict=True)
    ]


def _near(likelihood: BinomialLikelihood, known: Known, wanted: Sequence[Sequence[int]]) -> list[ColumnFit | None]:
    everything = np.eye(likelihood.parameters)
    near = maxima_near(likelihood, known, [everything[:, list(columns)] for columns in wanted]) if wanted else []
    return [
        None if one is None else ColumnFit(tuple(columns), one.point, one.log_likelihood)
        for columns, one in zip(wanted, near, strict=True)
    ]


def with_covariances(likelihood: BinomialLikelihood, fits: Sequence[ColumnFit]) -> list[ColumnFit]:
    """The same fits with the covariance of each that has a finite maximum: one pass for all that lack it."""
    lacking = [one for one in fits if one.finite and one.covariance is None]
    if not lacking:
        return list(fits)
    information = likelihood.evaluate(np.array([one.coefficients for one in lacking])).information
    assert information is not None
    told = {id(one): _covariance(one, found) for one, found in zip(lacking, information, strict=True)}
    return [replace(one, covariance=told.get(id(one), one.covariance)) for one in fits]


def _covariance(fit: ColumnFit, information: Array) -> Array:
    square = np.ix_(fit.columns, fit.columns)
    covariance = np.zeros_like(information)
    covariance[square] = solve(information[square], np.eye(len(fit.columns)))
    return covariance


def _alone(likelihood: BinomialLikelihood, start: Array, columns: tuple[int, ...]) -> ColumnFit | None:
    kept = list(columns)
    own = BinomialLikelihood.over(likelihood.passes.mapped(Columns(columns)), len(kept))
    fit = maximise(own, start=start[kept])
    if fit.status not in ("converged", "no finite maximum"):
        return None
    coefficients = np.zeros(start.size)
    coefficients[kept] = fit.coefficients
    covariance = np.zeros((start.size, start.size))
    covariance[np.ix_(kept, kept)] = fit.covariance
    return ColumnFit(columns, coefficients, fit.log_likelihood, fit.status == "converged", covariance)
