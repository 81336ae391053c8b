"""Linearity in the logit: whether a curve in place of a number's straight line would change the answer."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.curves import Curve, Curves, fit_curves, straight_lines
from oddsmodel.checks.exposure import MATTERS, Moved, moved
from oddsmodel.checks.odds_curve import GRID, LARGEST_DRAWN_LOG, odds_curve
from oddsmodel.findings import Finding
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import CurveFigure
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import finding, say

DOUBT = 0.05
LARGE = 1.25
"""A bend counts as seen below this p (times the number of curves looked at), and as large from this departure on."""


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
    column = curve.line.label
    return odds_curve(
        model,
        curve.line,
        curve.log_odds,
        identity=f"linearity-{curve.line.position}",
        title=say("linearity-figure-title", column=column),
        alt=say("linearity-figure-alt", column=column, statistic=curve.statistic, df=curve.df, p=curve.p),
    )
