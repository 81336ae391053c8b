"""Linearity in the logit: whether a curve in place of a number's straight line would change the answer."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.curves import Curve, Curves, Line, fit_curves, straight_lines
from oddsmodel.checks.exposure import MATTERS, Moved, moved
from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.figures import CurveFigure
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import finding, say

DOUBT = 0.05
LARGE = 1.25
"""A bend counts as seen below this p (times the number of curves looked at), and as large from this departure on."""

GRID = 101
BINS = 20
LONGEST_WHOLE_GRID = 200
LARGEST_DRAWN_LOG = 12.0
MOST_STEPS = 4096


@dataclass(frozen=True, slots=True)
class Judged:
    """A curve, set against the line it replaces.

    departure: the largest ratio of the odds by the curve to those by the line, or its inverse, over the middle nine
    tenths of the records, both taken relative to the median; None where it is beyond telling.
    moved: what the curve does to the exposure's odds ratio (None where the column is the exposure's only one).
    seen: whether the bend is more than chance, with the number of curves allowed for.
    """

    curve: Curve
    departure: float | None
    moved: Moved | None
    seen: bool
    of_exposure: bool

    @property
    def large(self) -> bool:
        return self.departure is None or self.departure >= LARGE

    @property
    def matters(self) -> bool:
        """Whether leaving the bend out changes the answer: the exposure's odds ratio, or the exposure's own line."""
        return self.seen and ((self.of_exposure and self.large) or _far(self.moved))


def check(model: FittedModel) -> CheckResult:
    """A restricted cubic spline against the straight line of each number column.

    Likelihood-ratio test of the bends (Durrleman & Simon 1989, Stat Med 8:551-561; Harrell 2001, Regression Modeling
    Strategies, section 2.4). With many records the smallest bend is seen, so its size and what it does to the
    exposure's odds ratio decide whether it matters, not p.
    """
    if model.grouping is not None:
        return _withheld(say("no-check-of-grouped-records"))
    lines = straight_lines(model)
    curves = fit_curves(model, lines)
    judged = [_judge(model, curve, len(curves.fitted)) for curve in curves.fitted]
    otherwise = _otherwise(model, curves)
    bent = [one for one in judged if one.seen]
    facts = {
        "lines": len(lines),
        "looked_at": [one.curve.line.label for one in judged],
        "bent": [[one.curve.line.label, one.departure] for one in bent],
        "doubtful": [one.curve.line.label for one in judged if not one.seen and one.large],
        **_moved_facts(otherwise),
    }
    verdict: Verdict = "fine"
    if not judged:
        verdict = "not applicable"
    elif any(one.matters for one in judged):
        verdict = "caution"
    elif any(one.seen and one.large for one in judged) or _far(otherwise):
        verdict = "look"
    statistics, reasons = _statistics(judged, otherwise)
    if not judged:
        reasons = dict.fromkeys(reasons, say("linearity-line", **facts))
    figures = tuple(figure for one in judged if (figure := _figure(model, one.curve)) is not None)
    return CheckResult(
        name="linearity",
        family="functional form",
        title=say("linearity-title"),
        verdict=verdict,
        line=say("linearity-line", **facts),
        statistics=statistics,
        reasons=reasons,
        findings=tuple(_finding(one) for one in bent),
        tables=(_table(judged),) if judged else (),
        figures=figures,
        explanation=say(
            "linearity-explanation",
            tests=len(judged),
            withheld=[[line.label, say(code)] for line, code in curves.withheld],
        ),
    )


def _withheld(reason: str) -> CheckResult:
    statistics, _ = _statistics([], None)
    nothing = dict.fromkeys(statistics)
    return CheckResult(
        name="linearity",
        family="functional form",
        title=say("linearity-title"),
        verdict="not applicable",
        line=reason,
        statistics=nothing,
        reasons=dict.fromkeys(nothing, reason),
        explanation=say("linearity-explanation", tests=0, withheld=[]),
    )


def _judge(model: FittedModel, curve: Curve, tests: int) -> Judged:
    position = curve.line.position
    lower, middle, upper = curve.line.entered.quantiles((0.05, 0.5, 0.95)).tolist()
    grid = np.linspace(lower, upper, GRID)
    bend = curve.log_odds(grid, middle)[0] - model.fit.coefficients[position] * (grid - middle)
    largest = float(np.abs(bend).max())
    others = [i for i in model.exposure_indices if i != position]
    return Judged(
        curve=curve,
        departure=math.exp(largest) if largest <= LARGEST_DRAWN_LOG else None,
        moved=moved(model, curve.coefficients, others),
        seen=curve.p * tests < DOUBT,
        of_exposure=position in model.exposure_indices,
    )


def _otherwise(model: FittedModel, curves: Curves) -> Moved | None:
    """The exposure's odds ratio with every curve at once; of exposure columns whose own line stands."""
    if curves.together is None:
        return None
    bent = {curve.line.position for curve in curves.fitted}
    return moved(model, curves.together, [i for i in model.exposure_indices if i not in bent])


def _far(one: Moved | None) -> bool:
    return one is not None and one.change >= MATTERS


def _moved_facts(one: Moved | None) -> dict[str, str | float | None]:
    return {
        "exposure": one.label if one else None,
        "before": one.before if one else None,
        "after": one.after if one else None,
    }


def _finding(one: Judged) -> Finding:
    return finding(
        "caution" if one.matters else "note",
        "not-a-straight-line",
        column=one.curve.line.label,
        p=one.curve.p,
        departure=one.departure,
        of_exposure=one.of_exposure,
        **_moved_facts(one.moved),
    )


def _statistics(judged: list[Judged], otherwise: Moved | None) -> tuple[dict[str, float | int | None], dict[str, str]]:
    departures = [one.departure for one in judged]
    known = [departure for departure in departures if departure is not None]
    statistics: dict[str, float | int | None] = {
        "curves": len(judged),
        "smallest_p": min((one.curve.p for one in judged), default=None),
        "largest_departure": max(known) if known and len(known) == len(departures) else None,
        "exposure_odds_ratio_with_lines": otherwise.before if otherwise else None,
        "exposure_odds_ratio_with_curves": otherwise.after if otherwise else None,
    }
    told = {"largest_departure": "linearity-no-departure"}
    reasons = {
        name: say(told.get(name, "linearity-no-exposure")) for name, value in statistics.items() if value is None
    }
    return statistics, reasons


def _table(judged: list[Judged]) -> Table:
    return Table(
        id="linearity",
        title=say("linearity-table"),
        columns=(
            TableColumn("column", say("form-heading-column")),
            TableColumn("statistic", say("form-heading-likelihood-ratio"), "number"),
            TableColumn("df", say("form-heading-degrees-of-freedom"), "number"),
            TableColumn("p", say("form-heading-p"), "p"),
            TableColumn("departure", say("form-heading-departure"), "odds_ratio"),
            TableColumn("before", say("form-heading-exposure-with-line"), "odds_ratio"),
            TableColumn("after", say("form-heading-exposure-with-curve"), "odds_ratio"),
        ),
        rows=tuple(
            (
                one.curve.line.label,
                one.curve.statistic,
                one.curve.df,
                one.curve.p,
                one.departure,
                one.moved.before if one.moved else None,
                one.moved.after if one.moved else None,
            )
            for one in judged
        ),
    )


def _figure(model: FittedModel, curve: Curve) -> CurveFigure | None:
    """Odds ratio against the column's value, relative to the median, over the middle 95% of the records."""
    from scipy.special import ndtri

    line = curve.line
    steady = _steady(model, line)
    spread, axis = (line.own, line.axis) if steady else (line.entered, line.label)
    whole = bool((spread.values == np.rint(spread.values)).all())
    lower, reference, upper = spread.quantiles((0.025, 0.5, 0.975)).tolist()
    if not lower < upper:
        return None
    grid = np.linspace(lower, upper, GRID)
    if whole and upper - lower <= LONGEST_WHOLE_GRID:
        lower, upper = math.floor(lower), math.ceil(upper)
        grid = np.arange(lower, upper + 1.0)
    at = _entered(model, line, np.append(grid, reference)) if steady else np.append(grid, reference)
    if at is None:
        return None
    entered_grid, entered_reference = at[:-1], float(at[-1])
    log_odds, error = curve.log_odds(entered_grid, entered_reference)
    half = float(ndtri(0.5 + model.level / 2.0)) * error
    straight = model.fit.coefficients[line.position] * (entered_grid - entered_reference)
    drawn = np.stack([log_odds, log_odds - half, log_odds + half, straight])
    if not np.abs(drawn).max() <= LARGEST_DRAWN_LOG:
        return None
    ratios = [tuple(row) for row in np.exp(drawn).tolist()]
    edges = _edges(lower, upper, whole=whole)
    records = np.rint(spread.in_bins(edges)).astype(int)
    return CurveFigure(
        id=f"linearity-{line.position}",
        title=say("linearity-figure-title", column=line.label),
        alt=say("linearity-figure-alt", column=line.label, statistic=curve.statistic, df=curve.df, p=curve.p),
        x_label=axis,
        x=tuple(grid.tolist()),
        curve=ratios[0],
        lower=ratios[1],
        upper=ratios[2],
        straight=ratios[3],
        reference=reference,
        density=tuple(zip(edges[:-1].tolist(), edges[1:].tolist(), records.tolist(), strict=True)),
    )


def _steady(model: FittedModel, line: Line) -> bool:
    """Whether what entered the model rises or falls steadily with the record column's values."""
    own = line.own.values
    if own.size > MOST_STEPS:
        own = own[np.linspace(0, own.size - 1, MOST_STEPS).astype(int)]
    entered = _entered(model, line, own)
    if entered is None:
        return False
    steps = np.diff(entered)
    return bool((steps >= 0).all() or (steps <= 0).all())


def _entered(model: FittedModel, line: Line, own: Array) -> Array | None:
    """What values (g,) of the record column become in the model matrix (g,); None where one has no place there."""
    if line.own is line.entered:
        return own
    record = model.rows.columns_at(np.zeros(1, dtype=np.int64))
    records = record.iloc[np.zeros(own.size, dtype=int)].assign(**{line.source: own})
    try:
        return model.design.encode(records)[:, line.position]
    except InputFault:
        return None


def _edges(lower: float, upper: float, *, whole: bool) -> Array:
    """About `BINS` bins of a round width over lower..upper, around whole numbers where the values are whole."""
    rough = (upper - lower) / BINS
    power = 10.0 ** math.floor(math.log10(rough))
    width = next(step * power for step in (1.0, 2.0, 2.5, 5.0, 10.0) if step * power >= rough * (1 - 1e-9))
    if whole:
        width = max(1.0, float(math.ceil(width)))
        first = math.floor(lower)
        return np.arange(first, math.floor(upper) + 1 + width, width) - 0.5
    first = math.floor(lower / width)
    return np.asarray(np.arange(first, math.ceil(upper / width) + 1) * width)
