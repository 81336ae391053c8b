"""Quantile groups: odds ratios of fifths or tenths of a number as points over its straight line."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.column_fits import ColumnFit, column_fits, known_at, with_covariances
from oddsmodel.checks.curves import Line, straight_lines
from oddsmodel.checks.number_lines import Withheld, rarer_outcome
from oddsmodel.checks.odds_curve import GRID, LARGEST_DRAWN_LOG, bin_edges
from oddsmodel.checks.spread import Spread
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.measures.wald import normal_quantile
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.passes import Leaf
from oddsmodel.plan.band_names import band_names
from oddsmodel.records.derived.quantile_groups import cut_points
from oddsmodel.results.figures import CurveFigure, CurvePoint
from oddsmodel.results.study import CheckResult
from oddsmodel.results.tables import Cell, Interval, Table, TableColumn
from oddsmodel.wording import say

FIFTHS, TENTHS = 5, 10
FEWEST_EVENTS = 10 * FIFTHS
EVENTS_FOR_TENTHS = 50 * TENTHS
"""Events, and records without one, from which there are groups at all, and from which there are tenths."""

FEWEST_GROUPS = 3


@dataclass(frozen=True, eq=False)
class Grouped:
    """The groups of a line. cuts (g - 1,): a group holds its lower cut point. medians, records (g,): of the groups.

    reference: the place of the group that holds the median of all.
    """

    line: Line
    cuts: Array
    medians: Array
    records: NDArray[np.int64]
    reference: int

    @property
    def others(self) -> list[int]:
        return [group for group in range(self.medians.size) if group != self.reference]

    @property
    def single_values(self) -> bool:
        """Whether each group is one value, so that the groups hold the line."""
        return bool(self.line.entered.values.size == self.medians.size)


@dataclass(frozen=True)
class Tested:
    """A line and the groups in its place: log odds ratios and their standard errors (g,), 0 for the reference.

    statistic, df, p: the likelihood-ratio test of the groups beside the line against the line alone.
    """

    grouped: Grouped
    log_odds: Array
    errors: Array
    statistic: float
    df: int
    p: float


@dataclass(frozen=True, eq=False)
class WithGroups:
    """Makes rows whose matrix has an indicator more for each group but the reference, for each of some lines."""

    positions: tuple[int, ...]
    cuts: tuple[Array, ...]
    groups: tuple[tuple[int, ...], ...]

    def __call__(self, rows: Leaf) -> Leaf:
        X = rows["X"]
        made = [X]
        for position, cuts, groups in zip(self.positions, self.cuts, self.groups, strict=True):
            own = np.searchsorted(cuts, X[:, position], side="right")
            made.append((own[:, None] == np.array(groups)).astype(np.float64))
        return {**rows, "X": np.hstack(made)}


def check(model: FittedModel) -> CheckResult:
    """Each straight line cut at its quantiles, in place of the line and beside it.

    The picture is that of Hosmer, Lemeshow & Sturdivant 2013, Applied Logistic Regression, section 4.2, with the
    likelihood-ratio test of the groups beside the line in the place of the eye.
    """
    tested: list[Tested] = []
    withheld: list[Withheld] = []
    reason: str | None = None
    if model.grouping is not None:
        reason = "no-check-of-grouped-records"
    elif rarer_outcome(model) < FEWEST_EVENTS:
        reason = "powers-few-events"
    else:
        tested, withheld = _test_all(model, straight_lines(model))
        reason = None if tested else "quantiles-no-lines"
    statistics: dict[str, float | int | None] = {
        "columns": len(tested),
        "smallest_p": min((one.p for one in tested), default=None),
    }
    unmet = say(reason, least=FEWEST_EVENTS) if reason else ""
    bent = [one.grouped.line.label for one in tested if one.p * len(tested) < 0.05]
    return CheckResult(
        name="quantile_groups",
        family="functional form",
        title=say("quantiles-title"),
        verdict="not applicable" if not tested else "look" if bent else "fine",
        line="",
        statistics=statistics,
        reasons={name: unmet for name, value in statistics.items() if value is None},
        tables=(_tests(tested), _groups(model, tested)) if tested else (),
        figures=tuple(figure for one in tested if (figure := _figure(model, one)) is not None),
        explanation=say(
            "quantiles-explanation",
            looked_at=[one.grouped.line.label for one in tested],
            bent=bent,
            withheld=[[line.label, say(code)] for line, code in withheld],
        ),
    )


def grouped(line: Line, number: int) -> Grouped | None:
    """The quantile groups of a line; None where fewer than three can be told apart."""
    spread = line.entered
    cuts = np.array([cut for cut in cut_points(spread.values, spread.counts, number) if cut <= spread.values[-1]])
    if cuts.size + 1 < FEWEST_GROUPS:
        return None
    groups = np.searchsorted(cuts, spread.values, side="right")
    parts = [Spread(spread.values[groups == k], spread.counts[groups == k]) for k in range(cuts.size + 1)]
    if not all(part.values.size for part in parts):
        return None
    medians = np.array([float(part.quantiles(0.5)) for part in parts])
    records = np.array([round(float(part.ends[-1])) for part in parts])
    reference = int(np.searchsorted(cuts, float(spread.quantiles(0.5)), side="right"))
    return Grouped(line, cuts, medians, records, reference)


def _test_all(model: FittedModel, lines: tuple[Line, ...]) -> tuple[list[Tested], list[Withheld]]:
    number = TENTHS if rarer_outcome(model) >= EVENTS_FOR_TENTHS else FIFTHS
    found = [(line, grouped(line, number)) for line in lines]
    withheld: list[Withheld] = [(line, "quantiles-few-groups") for line, one in found if one is None]
    kept = [one for _, one in found if one is not None]
    if not kept:
        return [], withheld
    p = len(model.design.columns)
    ends = [p, *(p + np.cumsum([one.cuts.size for one in kept])).tolist()]
    own = [tuple(range(first, last)) for first, last in pairwise(ends)]
    places = tuple(one.line.position for one in kept)
    made = WithGroups(places, tuple(one.cuts for one in kept), tuple(tuple(one.others) for one in kept))
    likelihood = BinomialLikelihood.over(model.rows.passes.mapped(made), ends[-1])
    start = np.zeros(ends[-1])
    start[:p] = model.fit.coefficients
    wanted: list[tuple[int, ...]] = []
    for one, columns in zip(kept, own, strict=True):
        in_place = (*(i for i in range(p) if i != one.line.position), *columns)
        wanted.append(in_place)
        if not one.single_values:
            wanted.append((*range(p), *columns))
    fits = iter(column_fits(likelihood, known_at(likelihood, start), wanted))
    pairs: list[tuple[Grouped, ColumnFit, ColumnFit]] = []
    for one in kept:
        in_place_fit = next(fits)
        beside = in_place_fit if one.single_values else next(fits)
        if in_place_fit is None or beside is None or not in_place_fit.finite:
            withheld.append((one.line, "quantiles-no-fit"))
        else:
            pairs.append((one, in_place_fit, beside))
    told = with_covariances(likelihood, [fit for _, fit, _ in pairs])
    tested = []
    for (one, _, beside), fit in zip(pairs, told, strict=True):
        tested.append(_tested(model, one, fit, beside, own[kept.index(one)]))
    return tested, withheld


def _tested(model: FittedModel, one: Grouped, fit: ColumnFit, beside: ColumnFit, own: tuple[int, ...]) -> Tested:
    assert fit.covariance is not None
    log_odds, errors = np.zeros(one.medians.size), np.zeros(one.medians.size)
    log_odds[one.others] = fit.coefficients[list(own)]
    errors[one.others] = np.sqrt(np.maximum(np.diag(fit.covariance)[list(own)], 0.0))
    statistic = max(0.0, 2.0 * (beside.log_likelihood - model.fit.log_likelihood))
    df = one.cuts.size - one.single_values
    return Tested(one, log_odds, errors, statistic, df, chi_square_p(statistic, df))


def _tests(tested: list[Tested]) -> Table:
    columns = (
        TableColumn("column", say("form-heading-column")),
        TableColumn("groups", say("quantiles-number"), "number"),
        TableColumn("statistic", say("form-heading-likelihood-ratio"), "number"),
        TableColumn("df", say("form-heading-degrees-of-freedom"), "number"),
        TableColumn("p", say("form-heading-p"), "p"),
    )
    rows: list[tuple[Cell, ...]] = [
        (one.grouped.line.label, int(one.grouped.medians.size), one.statistic, one.df, one.p) for one in tested
    ]
    return Table("quantile_groups", say("quantiles-tests"), columns, tuple(rows))


def _groups(model: FittedModel, tested: list[Tested]) -> Table:
    columns = (
        TableColumn("column", say("form-heading-column"), said_once=True),
        TableColumn("group", say("quantiles-group")),
        TableColumn("records", say("form-heading-records"), "count", sums_known=True),
        TableColumn("median", say("quantiles-median"), "number", hidden_with=("records",)),
        TableColumn("odds_ratio", say("quantiles-ratio"), "odds_ratio", hidden_with=("records",)),
        TableColumn("interval", say("quantiles-interval", level=model.level), "interval", hidden_with=("records",)),
        TableColumn("line", say("quantiles-by-line"), "odds_ratio", hidden_with=("records",)),
    )
    rows: list[tuple[Cell, ...]] = []
    blocks: list[int] = []
    for block, one in enumerate(tested):
        groups = one.grouped
        points = _points(model, one)
        by_line = np.exp(_by_line(model, groups, groups.medians))
        for k, (name, point) in enumerate(zip(band_names(tuple(groups.cuts.tolist())), points, strict=True)):
            cells: tuple[Cell, ...] = (point.ratio, Interval(point.lower, point.upper), float(by_line[k]))
            if k == groups.reference:
                cells = (say("quantiles-reference"), None, None)
            rows.append((groups.line.label, name, int(groups.records[k]), point.x, *cells))
            blocks.append(block)
    return Table("odds_ratios_of_quantile_groups", say("quantiles-groups"), columns, tuple(rows), blocks=tuple(blocks))


def _points(model: FittedModel, one: Tested) -> tuple[CurvePoint, ...]:
    half = normal_quantile(model.level) * one.errors
    limits = np.exp(np.stack([one.log_odds, one.log_odds - half, one.log_odds + half])).T.tolist()
    groups = one.grouped
    points: list[CurvePoint] = []
    for k, (ratio, lower, upper) in enumerate(limits):
        interval = (lower, upper) if k != groups.reference else (None, None)
        points.append(CurvePoint(float(groups.medians[k]), ratio, int(groups.records[k]), *interval))
    return tuple(points)


def _by_line(model: FittedModel, groups: Grouped, x: Array) -> Array:
    """Log odds by the straight line at x (g,), relative to the median of the reference group."""
    return np.asarray(model.fit.coefficients[groups.line.position] * (x - groups.medians[groups.reference]))


def _figure(model: FittedModel, one: Tested) -> CurveFigure | None:
    groups, line = one.grouped, one.grouped.line
    lower, upper = line.entered.quantiles((0.025, 0.975)).tolist()
    if not lower < upper:
        return None
    grid = np.linspace(lower, upper, GRID)
    straight, points = _by_line(model, groups, grid), _points(model, one)
    if max(float(np.abs(straight).max()), float(np.abs(one.log_odds).max())) > LARGEST_DRAWN_LOG:
        return None
    edges = bin_edges(lower, upper, whole=bool((line.entered.values == np.rint(line.entered.values)).all()))
    records = np.rint(line.entered.in_bins(edges)).astype(int)
    facts = {"column": line.label, "groups": int(groups.medians.size)}
    return CurveFigure(
        id=f"quantiles-{line.position}",
        title=say("quantiles-figure-title", **facts),
        alt=say("quantiles-figure-alt", **facts),
        x_label=line.axis if line.own is line.entered else line.label,
        x=tuple(grid.tolist()),
        curve=(),
        lower=(),
        upper=(),
        straight=tuple(np.exp(straight).tolist()),
        reference=float(groups.medians[groups.reference]),
        density=tuple(zip(edges[:-1].tolist(), edges[1:].tolist(), records.tolist(), strict=True)),
        points=points,
    )
