"""What is left to estimate where records are separated: the fit on the records that are not."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from oddsmodel.inference.conditioning import coordinates
from oddsmodel.inference.cone_rows import Direction
from oddsmodel.inference.maximise import Fit, Status, maximise
from oddsmodel.inference.recession_cone import RecessionCone
from oddsmodel.inference.separation import Separation
from oddsmodel.likelihood.base import Array
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.passes import Leaf, MemoryPasses


@dataclass(frozen=True)
class FinitePart:
    """The maximum in the limit, in which every separated row has its outcome for certain and adds nothing.

    status: that of the fit, or "no rows kept" where the limit is certain for every row. coefficients (p,) and
    standard_errors (p,): None where there is no finite value. finite (f,): the others, and their covariance (f, f).
    log_likelihood: the supremum of the log-likelihood, constants left out; None where the fit did not settle.

    fit: on the rows kept, in the columns (r,) of the model that are independent there; None where it has none. The
    estimates of finite contrasts do not depend on which columns are left out.
    """

    status: Status | Literal["no rows kept"]
    coefficients: tuple[float | None, ...]
    standard_errors: tuple[float | None, ...]
    finite: tuple[int, ...]
    covariance: Array
    log_likelihood: float | None
    fit: Fit | None
    columns: tuple[int, ...]

    def within(self, contrasts: Array) -> Array:
        """Finite contrasts (k, p) of all coefficients as contrasts (k, r) of those of the fit, for `profile`."""
        return np.atleast_2d(np.asarray(contrasts, dtype=np.float64))[:, list(self.columns)]


def finite_part(likelihood: BinomialLikelihood, verdict: Separation) -> FinitePart:
    """Fit the rows that are not separated (Konis 2007; Correia, Guimarães & Zylkin 2019).

    Along the direction that separates the others these rows keep their value and the others rise to zero, so that
    the supremum is the maximum on the rows kept. They overlap, so that it is attained there; columns that are
    combinations of others on these rows are left out. A coefficient that is constant over the recession cone has the
    value it has there, and its profile log-likelihood is that of this fit.
    """
    p = likelihood.parameters
    finite = tuple(j for j, kind in enumerate(verdict.coefficients) if kind == "finite")
    kept, columns = kept_rows(likelihood, verdict.cone)
    nothing = (None,) * p
    if not columns:
        rest = kept_likelihood(likelihood, verdict.cone.direction, range(p))
        value = float(rest.evaluate(np.zeros((1, p)), information=False).log_likelihood[0])
        return FinitePart("no rows kept", nothing, nothing, (), np.zeros((0, 0)), value, None, ())
    fit = maximise(kept)
    if fit.status != "converged":
        return FinitePart(fit.status, nothing, nothing, finite, np.zeros((0, 0)), None, fit, columns)
    place = {column: k for k, column in enumerate(columns)}
    at = [place[j] for j in finite]
    values, errors = fit.coefficients[at].tolist(), fit.standard_errors[at].tolist()
    return FinitePart(
        status=fit.status,
        coefficients=_spread(values, finite, p),
        standard_errors=_spread(errors, finite, p),
        finite=finite,
        covariance=fit.covariance[np.ix_(at, at)],
        log_likelihood=fit.log_likelihood,
        fit=fit,
        columns=columns,
    )


def kept_rows(likelihood: BinomialLikelihood, cone: RecessionCone) -> tuple[BinomialLikelihood, tuple[int, ...]]:
    """The rows that a cone leaves at zero, in the columns that are independent on them."""
    columns: Sequence[int] = range(likelihood.parameters)
    if cone.inexact is None:
        columns = cone.kept.pivots
        return kept_likelihood(likelihood, cone.direction, columns), tuple(columns)
    whole = kept_likelihood(likelihood, cone.direction, columns)
    aliased = {one.column for one in coordinates(whole).aliased}
    columns = [j for j in columns if j not in aliased]
    return kept_likelihood(likelihood, cone.direction, columns), tuple(columns)


def kept_likelihood(likelihood: BinomialLikelihood, direction: Direction, columns: Sequence[int]) -> BinomialLikelihood:
    """The likelihood of the rows that a direction leaves at zero, in some of the columns."""
    make = Kept(direction, tuple(columns))
    passes = likelihood.passes
    if not isinstance(passes, MemoryPasses):
        return BinomialLikelihood.over(passes.mapped(make), len(make.columns))
    rows = passes.arrays
    kept = direction.signs(rows["X"]) == 0
    X = np.ascontiguousarray(rows["X"][kept][:, list(columns)])
    return BinomialLikelihood.over(
        MemoryPasses({name: X if name == "X" else array[kept] for name, array in rows.items()}), len(make.columns)
    )


@dataclass(frozen=True)
class Kept:
    """Rows in some columns, without events and trials where a direction separates them."""

    direction: Direction
    columns: tuple[int, ...]

    def __call__(self, rows: Leaf) -> Leaf:
        kept = self.direction.signs(rows["X"]) == 0
        trials = rows.get("trials")
        return {
            **rows,
            "X": np.ascontiguousarray(rows["X"][:, list(self.columns)]),
            "events": rows["events"] * kept,
            "trials": kept.astype(np.float64) if trials is None else trials * kept,
        }


def _spread(values: Sequence[float], places: Sequence[int], size: int) -> tuple[float | None, ...]:
    spread: list[float | None] = [None] * size
    for place, value in zip(places, values, strict=True):
        spread[place] = value
    return tuple(spread)
