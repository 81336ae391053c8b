"""A curve in place of each straight line: knots, one widened matrix, and all fits in shared passes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.design.splines import harrell_knots, restricted_cubic_basis
from oddsmodel.design.weighted import weighted_quantiles
from oddsmodel.inference.maximise import Fit, Problem, maximise_all
from oddsmodel.inference.tests import likelihood_ratio
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.fitted import Array, FittedModel

FEWEST_VALUES = 5
MANY_VALUES = 10
"""Below five distinct values there is no curve to speak of; from ten on four knots are tried before three."""

LEAST_OFF_THE_PILE = 0.1


@dataclass(frozen=True, slots=True)
class Line:
    """A number column, or a function of one such as its log, that enters the model as a straight line.

    position: of its column in the model matrix. source: the record column. label: for words; axis: of the record
    column with its units.
    """

    position: int
    source: str
    label: str
    axis: str


@dataclass(frozen=True, slots=True)
class Curve:
    """A line with the fit in which a restricted cubic spline stands in its place.

    knots (k,); columns (k - 1,): positions of the spline's columns in the widened matrix, the line itself first.
    statistic, df, p: the likelihood-ratio test of the curve against the line.
    """

    line: Line
    knots: Array
    columns: tuple[int, ...]
    fit: Fit
    statistic: float
    df: int
    p: float

    def log_odds(self, x: Array, reference: float) -> tuple[Array, Array]:
        """Log odds at x (g,) relative to `reference`, and their standard errors (g,)."""
        basis = restricted_cubic_basis(x, self.knots) - restricted_cubic_basis(np.array([reference]), self.knots)
        columns = list(self.columns)
        variance = np.einsum("ij,jk,ik->i", basis, self.fit.covariance[np.ix_(columns, columns)], basis)
        return basis @ self.fit.coefficients[columns], np.sqrt(np.maximum(variance, 0.0))


@dataclass(frozen=True, slots=True)
class Curves:
    """The curves that could be fitted, one at a time; the fit with all of them together (None where there is none);
    and the lines for which there is no curve, with the code of the reason."""

    fitted: tuple[Curve, ...]
    together: Fit | None
    withheld: tuple[tuple[Line, str], ...]


def straight_lines(model: FittedModel) -> tuple[Line, ...]:
    """The columns of the model matrix that are a number, or one function of one number, and nothing else is.

    A number that also enters a spline, a power, an interaction or another term is not taken to be straight.
    """
    lines: list[Line] = []
    columns = model.design.columns
    for position, column in enumerate(columns):
        if column.kind not in ("number", "transform") or len(column.sources) != 1:
            continue
        source = column.sources[0]
        if sum(source in other.sources for other in columns) > 1 or source not in model.columns:
            continue
        label, units = model.columns[source].label, model.columns[source].units
        axis = f"{label} ({units})" if units else label
        lines.append(Line(position, source, f"{label} as {column.term}" if column.kind == "transform" else label, axis))
    return tuple(lines)


def choose_knots(x: Array, counts: Array) -> Array | str:
    """Knots for a restricted cubic spline of x (m,) with frequencies counts (m,), or the code of why there are none.

    Four at Harrell's quantiles (Harrell 2001, Regression Modeling Strategies, table 2.3), three where values are few or
    four fall together. Where values pile up at one end (many zeros), a knot there and two among the others.
    """
    used = counts > 0
    x, counts = x[used], counts[used]
    distinct = np.unique(x).size
    if distinct < FEWEST_VALUES:
        return "linearity-few-values"
    for number in (4, 3) if distinct >= MANY_VALUES else (3,):
        knots = harrell_knots(x, number, counts)
        if np.unique(knots).size == number:
            return knots
    for end, shares in ((x.min(), (0.5, 0.95)), (x.max(), (0.05, 0.5))):
        rest = x != end
        if counts[rest].sum() < LEAST_OFF_THE_PILE * counts.sum():
            continue
        knots = np.unique([end, *weighted_quantiles(x[rest], shares, counts[rest])])
        if knots.size == 3:
            return np.asarray(knots)
    return "linearity-values-pile-up"


def fit_curves(model: FittedModel, lines: tuple[Line, ...]) -> Curves:
    """All curves of the lines, each alone and all together, on one widened matrix [X, bends of every line]."""
    X, trials = model.patterns.X, model.patterns.trials
    withheld: list[tuple[Line, str]] = []
    chosen: list[tuple[Line, Array]] = []
    for line in lines:
        knots = choose_knots(X[:, line.position], trials)
        if isinstance(knots, str):
            withheld.append((line, knots))
        else:
            chosen.append((line, knots))
    while chosen:
        bends = [restricted_cubic_basis(X[:, line.position], knots)[:, 1:] for line, knots in chosen]
        ends = X.shape[1] + np.cumsum([bend.shape[1] for bend in bends])
        places = [tuple(range(end - bend.shape[1], end)) for end, bend in zip(ends.tolist(), bends, strict=True)]
        widened = BinomialLikelihood(np.hstack([X, *bends]), model.patterns.events, trials=trials)
        start = np.zeros(widened.parameters)
        start[: X.shape[1]] = model.fit.coefficients
        together = maximise_all(widened, [Problem(start=start)])[0]
        if together.status != "aliased":
            break
        aliased = {relation.column for relation in together.aliased}
        tied = [one for one, place in zip(chosen, places, strict=True) if aliased & set(place)]
        withheld.extend((line, "linearity-tied") for line, _ in tied)
        chosen = [one for one in chosen if one not in tied] if tied else []
    if not chosen:
        return Curves((), None, tuple(withheld))
    near = together if together.status == "converged" else None
    fits = [together]
    if len(chosen) > 1:
        kept = [[*range(X.shape[1]), *place] for place in places]
        problems = [Problem(np.eye(widened.parameters)[:, columns], start=None if near else start) for columns in kept]
        fits = maximise_all(widened, problems, near=near)
    fitted: list[Curve] = []
    for (line, knots), place, fit in zip(chosen, places, fits, strict=True):
        if fit.status != "converged":
            withheld.append((line, "linearity-no-fit"))
            continue
        statistic, df, p = likelihood_ratio(fit, model.fit)
        fitted.append(Curve(line, knots, (line.position, *place), fit, statistic, df, p))
    return Curves(tuple(fitted), near, tuple(withheld))
