"""All powers and pairs of powers of a number in place of its line, fitted side by side, and the closed test."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.column_fits import ColumnFit, Columns, column_fits, known_at, with_covariances
from oddsmodel.checks.curves import Line
from oddsmodel.checks.powers import LINE, POWERS, PowerColumns, WithPowers
from oddsmodel.design.constant import indicators_of_all_levels
from oddsmodel.inference.conditioning import coordinates
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.likelihood.binomial import BinomialLikelihood, Moved
from oddsmodel.model.fitted import Array, FittedModel

LEVEL = 0.05

STRAIGHT = (1.0,)


@dataclass(frozen=True, slots=True)
class Step:
    """A likelihood-ratio test of the best pair of powers against something simpler."""

    statistic: float
    df: int
    p: float


@dataclass(frozen=True, eq=False)
class Shape:
    """A fit with one or two powers in place of the line.

    powers: one, or two that may be equal. coefficients (p,): of the other columns in the model's order, 0 for the line.
    at: the places of the functions among the power columns; weights (r,) their coefficients, covariance (r, r).
    Both are None where there is no finite maximum.
    """

    powers: tuple[float, ...]
    log_likelihood: float
    columns: PowerColumns
    at: tuple[int, ...]
    coefficients: Array | None = None
    weights: Array | None = None
    covariance: Array | None = None

    def log_odds(self, x: Array, reference: float) -> tuple[Array, Array]:
        """Log odds at x (g,) relative to `reference`, and their standard errors (g,), the powers taken as given."""
        assert self.weights is not None
        assert self.covariance is not None
        at = list(self.at)
        basis = self.columns.of(x)[:, at] - self.columns.of(np.array([reference]))[:, at]
        variance = np.einsum("ij,jk,ik->i", basis, self.covariance, basis)
        return basis @ self.weights, np.sqrt(np.maximum(variance, 0.0))


@dataclass(frozen=True, eq=False)
class Closed:
    """The fits of one line and the closed test of them (Ambler & Royston 2001, J Stat Comput Simul 69:89-108).

    first, second: the best with one power and with two. against_nothing, against_line, against_one: the best pair
    against the column left out (4 degrees of freedom), its straight line (3) and the best power (2), in this order; the
    first p above 0.05 ends the test and leaves the simpler one. chosen: () for nothing, (1,) for the line, else powers.
    unsettled: how many of the fits came to no answer.
    """

    line: Line
    first: Shape
    second: Shape
    against_nothing: Step
    against_line: Step
    against_one: Step
    chosen: tuple[float, ...]
    unsettled: int

    @property
    def shape(self) -> Shape:
        """What is chosen where that is no line; where it is one, the best pair."""
        return self.first if len(self.chosen) == 1 and self.chosen != STRAIGHT else self.second


def closed_test(nothing: float, line: float, one: float, two: float) -> tuple[Step, Step, Step, int]:
    """The three tests from maximised log-likelihoods, and how many in a row have p below 0.05."""
    steps = []
    for simpler, df in ((nothing, 4), (line, 3), (one, 2)):
        statistic = max(0.0, 2.0 * (two - simpler))
        steps.append(Step(statistic, df, chi_square_p(statistic, df)))
    passed = next((k for k, step in enumerate(steps) if not step.p < LEVEL), len(steps))
    return steps[0], steps[1], steps[2], passed


def constant_columns(model: FittedModel) -> tuple[int, ...]:
    """Positions of columns that add up to the constant: the intercept, or the indicators of all levels of a column."""
    intercept = tuple(i for i, column in enumerate(model.design.columns) if column.kind == "intercept")
    return intercept or indicators_of_all_levels(model.design)


def fit_powers(model: FittedModel, line: Line, powers: PowerColumns) -> Closed | None:
    """The closed test of a line; None where the fits that it rests on came to no answer."""
    wide = _Wide(model, line, powers)
    p = wide.others_number
    other = tuple(range(p))
    ones = [place for place in range(len(POWERS)) if place != LINE]
    wanted = [other, *((*other, p + place) for place in ones)]
    wanted += [(*other, p + first, p + len(POWERS) + k) for k, (first, _) in enumerate(powers.pairs)]
    fits = column_fits(wide.likelihood, known_at(wide.likelihood, wide.start), wanted)
    nothing = fits[0]
    straight = ColumnFit((*other, p + LINE), wide.start, model.fit.log_likelihood)
    single = [(POWERS[place],) for place in ones]
    firsts = _settled([*single, STRAIGHT], [*fits[1 : 1 + len(ones)], straight])
    seconds = _settled([powers.powers(k) for k in range(len(powers.pairs))], fits[1 + len(ones) :])
    if nothing is None or not seconds:
        return None
    best = [max(found, key=lambda one: one[1].log_likelihood) for found in (firsts, seconds)]
    first, second = wide.shapes(best)
    tests = closed_test(nothing.log_likelihood, straight.log_likelihood, first.log_likelihood, second.log_likelihood)
    chosen = ((), STRAIGHT, first.powers, second.powers)[tests[3]]
    return Closed(line, first, second, *tests[:3], chosen, sum(one is None for one in fits))


_Named = tuple[tuple[float, ...], ColumnFit]


def _settled(powers: Sequence[tuple[float, ...]], fits: Sequence[ColumnFit | None]) -> list[_Named]:
    return [(one, fit) for one, fit in zip(powers, fits, strict=True) if fit is not None]


class _Wide:
    """The rows with the powers of a line, the other columns in coordinates in which the arithmetic is safe."""

    def __init__(self, model: FittedModel, line: Line, powers: PowerColumns) -> None:
        self.model, self.line, self.powers = model, line, powers
        p = len(model.design.columns)
        self.others = tuple(i for i in range(p) if i != line.position)
        self.others_number = len(self.others)
        passes = model.rows.passes
        self.space = coordinates(BinomialLikelihood.over(passes.mapped(Columns(self.others)), len(self.others)))
        to_beta = self.space.to_beta
        moved = None if to_beta is None else Moved(np.asarray(to_beta, dtype=np.longdouble))
        wide = WithPowers(self.others, moved, line.position, powers)
        self.likelihood = BinomialLikelihood.over(passes.mapped(wide), self.others_number + powers.number)
        self.start = self._start()

    def _start(self) -> Array:
        """The model itself: b x = b (scale length u + scale mean - shift) for the standardised line u."""
        origin, beta = self.powers.origin, self.model.fit.coefficients
        slope = float(beta[self.line.position]) * origin.scale
        shifted = beta.copy()
        shifted[list(constant_columns(self.model))] += slope * (
            float(self.powers.means[LINE]) - origin.shift / origin.scale
        )
        start = np.zeros(self.likelihood.parameters)
        start[: self.others_number] = self.space.gamma(shifted[list(self.others)])
        start[self.others_number + LINE] = slope * float(self.powers.lengths[LINE])
        return start

    def shapes(self, best: Sequence[_Named]) -> list[Shape]:
        fits = with_covariances(self.likelihood, [fit for _, fit in best])
        return [self._shape(powers, fit) for (powers, _), fit in zip(best, fits, strict=True)]

    def _shape(self, powers: tuple[float, ...], fit: ColumnFit) -> Shape:
        p = self.others_number
        own = [column for column in fit.columns if column >= p]
        at = tuple(column - p for column in own)
        if not fit.finite or fit.covariance is None:
            return Shape(powers, fit.log_likelihood, self.powers, at)
        coefficients = np.zeros(len(self.model.design.columns))
        coefficients[list(self.others)] = self.space.beta(fit.coefficients[:p])
        return Shape(
            powers=powers,
            log_likelihood=fit.log_likelihood,
            columns=self.powers,
            at=at,
            coefficients=coefficients,
            weights=fit.coefficients[own],
            covariance=fit.covariance[np.ix_(own, own)],
        )
