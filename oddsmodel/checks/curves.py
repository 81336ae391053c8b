"""A curve in place of each straight line: knots, rows with the bends of every line beside them, all fits together."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from oddsmodel.checks.bends import Bends
from oddsmodel.checks.nearby import PART_FROM, Known, Nearby, maxima_near, well_conditioned
from oddsmodel.checks.spread import Among, Spread, spreads
from oddsmodel.design.splines import HARRELL_QUANTILES, restricted_cubic_basis
from oddsmodel.inference.maximise import Fit, Problem, maximise_all
from oddsmodel.inference.symmetric import solve
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.model.rows import COLUMN

FEWEST_VALUES = 5
MANY_VALUES = 10
"""Below five distinct values there is no curve to speak of; from ten on four knots are tried before three."""

LEAST_OFF_THE_PILE = 0.1

FAR = 1e-4
"""Squared distance in standard errors, for each row, from which the information at a curve is asked of all rows."""


@dataclass(frozen=True, slots=True)
class Line:
    """A number column, or a function of one such as its log, that enters the model as a straight line.

    position: of its column in the model matrix. source: the record column. label: for words; axis: of the record
    column with its units. entered: the values as they entered the model; own: those of the record column.
    """

    position: int
    source: str
    label: str
    axis: str
    entered: Spread
    own: Spread


@dataclass(frozen=True, slots=True)
class Curve:
    """A line with the fit in which a restricted cubic spline stands in its place.

    knots (k,); columns (k - 1,): positions of the spline's columns in the widened matrix, the line itself first.
    coefficients (q,) and covariance (q, q): those of the widened matrix, 0 for the bends of other lines.
    statistic, df, p: the likelihood-ratio test of the curve against the line.
    """

    line: Line
    knots: Array
    columns: tuple[int, ...]
    coefficients: Array
    covariance: Array
    statistic: float
    df: int
    p: float

    def log_odds(self, x: Array, reference: float) -> tuple[Array, Array]:
        """Log odds at x (g,) relative to `reference`, and their standard errors (g,)."""
        basis = restricted_cubic_basis(x, self.knots) - restricted_cubic_basis(np.array([reference]), self.knots)
        columns = list(self.columns)
        variance = np.einsum("ij,jk,ik->i", basis, self.covariance[np.ix_(columns, columns)], basis)
        return basis @ self.coefficients[columns], np.sqrt(np.maximum(variance, 0.0))


@dataclass(frozen=True, slots=True)
class Curves:
    """The curves that could be fitted, one at a time; the coefficients with all of them together (None where there
    are none); and the lines for which there is no curve, with the code of the reason."""

    fitted: tuple[Curve, ...]
    together: Array | None
    withheld: tuple[tuple[Line, str], ...]


@dataclass(frozen=True, slots=True)
class _Bent:
    """A maximum over the columns of the model and the bends of some lines."""

    coefficients: Array
    covariance: Array
    log_likelihood: float


def straight_lines(model: FittedModel) -> tuple[Line, ...]:
    """The columns of the model matrix that are a number, or one function of one number, and nothing else is.

    A number that also enters a spline, a power, an interaction or another term is not taken to be straight.
    """
    columns = model.design.columns
    straight = [
        position
        for position, column in enumerate(columns)
        if column.kind in ("number", "transform")
        and len(column.sources) == 1
        and sum(column.sources[0] in other.sources for other in columns) == 1
        and column.sources[0] in model.columns
    ]
    if not straight:
        return ()
    functions = [position for position in straight if columns[position].kind == "transform"]
    asked = [Among("X", position) for position in straight]
    asked += [Among(COLUMN + columns[position].sources[0]) for position in functions]
    found = spreads(model.rows.with_columns if functions else model.rows.passes, asked)
    own = dict(zip(functions, found[len(straight) :], strict=True))
    lines: list[Line] = []
    for position, entered in zip(straight, found, strict=False):
        column = columns[position]
        source = column.sources[0]
        label, units = model.columns[source].label, model.columns[source].units
        axis = f"{label} ({units})" if units else label
        name = f"{label} as {column.term}" if column.kind == "transform" else label
        lines.append(Line(position, source, name, axis, entered, own.get(position, entered)))
    return tuple(lines)


def choose_knots(spread: Spread) -> Array | str:
    """Knots for a restricted cubic spline of a column, or the code of why there are none.

    Four at Harrell's quantiles (Harrell 2001, Regression Modeling Strategies, table 2.3), three where values are few or
    four fall together. Where values pile up at one end (many zeros), a knot there and two among the others.
    """
    distinct = spread.values.size
    if distinct < FEWEST_VALUES:
        return "linearity-few-values"
    for number in (4, 3) if distinct >= MANY_VALUES else (3,):
        knots = spread.quantiles(HARRELL_QUANTILES[number])
        if np.unique(knots).size == number:
            return knots
    for end, shares in ((spread.values[0], (0.5, 0.95)), (spread.values[-1], (0.05, 0.5))):
        rest = spread.without(end)
        if rest.ends[-1] < LEAST_OFF_THE_PILE * spread.ends[-1]:
            continue
        knots = np.unique([end, *rest.quantiles(shares)])
        if knots.size == 3:
            return np.asarray(knots)
    return "linearity-values-pile-up"


def fit_curves(model: FittedModel, lines: tuple[Line, ...]) -> Curves:
    """All curves of the lines, each alone and all together, on rows widened by the bends of every line."""
    p = len(model.design.columns)
    withheld: list[tuple[Line, str]] = []
    chosen: list[tuple[Line, Array]] = []
    for line in lines:
        knots = choose_knots(line.entered)
        if isinstance(knots, str):
            withheld.append((line, knots))
        else:
            chosen.append((line, knots))
    found: list[_Bent | None] = []
    places: list[tuple[int, ...]] = []
    while chosen:
        bends = Bends(tuple(line.position for line, _ in chosen), tuple(knots for _, knots in chosen))
        places = bends.places(p)
        found, aliased = _fits(model, bends, places)
        if not aliased:
            break
        tied = [one for one, place in zip(chosen, places, strict=True) if aliased & set(place)]
        withheld.extend((line, "linearity-tied") for line, _ in tied)
        chosen = [one for one in chosen if one not in tied] if tied else []
    fitted: list[Curve] = []
    for (line, knots), place, fit in zip(chosen, places, found, strict=False):
        if fit is None:
            withheld.append((line, "linearity-no-fit"))
            continue
        statistic = max(0.0, 2.0 * (fit.log_likelihood - model.fit.log_likelihood))
        columns, df = (line.position, *place), len(place)
        p_value = chi_square_p(statistic, df)
        fitted.append(Curve(line, knots, columns, fit.coefficients, fit.covariance, statistic, df, p_value))
    together = found[-1] if found else None
    return Curves(tuple(fitted), together.coefficients if together else None, tuple(withheld))


def _fits(model: FittedModel, bends: Bends, places: Sequence[tuple[int, ...]]) -> tuple[list[_Bent | None], set[int]]:
    """A maximum for each curve alone and one for all together, None where it is not finite; and the positions of
    columns that are combinations of others, where there are any and so no maximum."""
    p = len(model.design.columns)
    parameters = places[-1][-1] + 1
    start = np.zeros(parameters)
    start[:p] = model.fit.coefficients
    kept = [[*range(p), *place] for place in places]
    if len(kept) > 1:
        kept.append(list(range(parameters)))
    likelihood = BinomialLikelihood.over(bends.beside(model.rows.passes), parameters)
    found: list[_Bent | None] = [None] * len(kept)
    if likelihood.rows > PART_FROM:
        found = _near(likelihood, start, kept)
    if any(one is None for one in found):
        slow, aliased = _far(likelihood, start, kept)
        if aliased:
            return [], aliased
        found = [one or other for one, other in zip(found, slow, strict=True)]
    return found if len(found) > 1 else [*found, *found], set()


def _near(likelihood: BinomialLikelihood, start: Array, kept: Sequence[list[int]]) -> list[_Bent | None]:
    """Where the lines are a good place to begin: the information there, then passes that need none."""
    at = likelihood.evaluate(start)
    if at.information is None or not well_conditioned(at.information[0]):
        return [None] * len(kept)
    everything = np.eye(start.size)
    known = Known(start, at.score[0], at.information[0])
    found = maxima_near(likelihood, known, [everything[:, columns] for columns in kept])
    # of all together no covariance is asked for
    alone = [one for one in found[: max(1, len(kept) - 1)] if one is not None]
    far = [one for one in alone if one.distance > FAR * likelihood.rows]
    if far:
        exact = likelihood.evaluate(np.array([one.point for one in far])).information
        assert exact is not None
        for one, information in zip(far, exact, strict=True):
            found[found.index(one)] = replace(one, information=information)
    return [None if one is None else _bent(one, columns) for one, columns in zip(found, kept, strict=True)]


def _bent(found: Nearby, columns: list[int]) -> _Bent:
    covariance = np.zeros_like(found.information)
    square = np.ix_(columns, columns)
    covariance[square] = solve(found.information[square], np.eye(len(columns)))
    return _Bent(found.point, covariance, found.log_likelihood)


def _far(
    likelihood: BinomialLikelihood, start: Array, kept: Sequence[list[int]]
) -> tuple[list[_Bent | None], set[int]]:
    """By full Newton steps: everything together first, the curves alone from there."""
    together = maximise_all(likelihood, [Problem(start=start)])[0]
    if together.status == "aliased":
        return [], {relation.column for relation in together.aliased}
    fits = [together]
    if len(kept) > 1:
        near = together if together.status == "converged" else None
        everything = np.eye(start.size)
        problems = [Problem(everything[:, columns], start=None if near else start) for columns in kept[:-1]]
        fits = [*maximise_all(likelihood, problems, near=near), together]
    return [_converged(fit) for fit in fits], set()


def _converged(fit: Fit) -> _Bent | None:
    return _Bent(fit.coefficients, fit.covariance, fit.log_likelihood) if fit.status == "converged" else None
