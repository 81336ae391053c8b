"""Fractional polynomials: whether one power of a number, or two, fit better than its straight line."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.checks.exposure import MATTERS, Moved, moved
from oddsmodel.checks.number_lines import Withheld, no_powers, number_lines, told_shift
from oddsmodel.checks.odds_curve import odds_curve
from oddsmodel.checks.power_fits import STRAIGHT, Closed, fit_powers
from oddsmodel.checks.powers import power_columns
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import CurveFigure
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say

FEWEST_EVENTS = 40
"""Ten for each of the four degrees of freedom of the first test."""


@dataclass(frozen=True)
class Judged:
    """The closed test of one line. moved: what the chosen curve does to the exposure's odds ratio."""

    closed: Closed
    moved: Moved | None
    of_exposure: bool

    @property
    def curved(self) -> bool:
        return self.closed.chosen not in ((), STRAIGHT)

    @property
    def matters(self) -> bool:
        return self.curved and (self.of_exposure or (self.moved is not None and self.moved.change >= MATTERS))


def check(model: FittedModel) -> CheckResult:
    """Powers of degree one and two in place of each straight line, and the closed test of them.

    Royston & Altman 1994, Applied Statistics 43:429-467; Ambler & Royston 2001: the best pair against nothing, against
    the line and against the best power.
    """
    reason = no_powers(model, FEWEST_EVENTS)
    judged: list[Judged] = []
    withheld: list[Withheld] = []
    if reason is None:
        lines, withheld = number_lines(model)
        for line in lines:
            powers = power_columns(line.entered)
            closed = None if powers is None else fit_powers(model, line, powers)
            if closed is not None:
                judged.append(_judged(model, closed))
            else:
                withheld.append((line, "powers-no-place" if powers is None else "powers-not-settled"))
        reason = None if judged else "powers-no-lines"
    statistics: dict[str, float | int | None] = {
        "columns": len(judged),
        "curves_chosen": sum(one.curved for one in judged) if judged else None,
        "smallest_p_against_line": min((one.closed.against_line.p for one in judged), default=None),
    }
    verdict: Verdict = "fine" if judged else "not applicable"
    if any(one.matters for one in judged):
        verdict = "look"
    unmet = say(reason, least=FEWEST_EVENTS) if reason else ""
    return CheckResult(
        name="fractional_polynomials",
        family="functional form",
        title=say("powers-title"),
        verdict=verdict,
        line="",
        statistics=statistics,
        reasons={name: unmet for name, value in statistics.items() if value is None},
        tables=(_shapes(judged), _tests(judged)) if judged else (),
        figures=tuple(figure for one in judged if (figure := _figure(model, one)) is not None),
        explanation=say(
            "powers-explanation",
            found=[[one.closed.line.label, list(one.closed.chosen)] for one in judged],
            withheld=[[line.label, say(code)] for line, code in withheld],
        ),
    )


def _judged(model: FittedModel, closed: Closed) -> Judged:
    position = closed.line.position
    shape, others = closed.shape, [i for i in model.exposure_indices if i != position]
    change = None if shape.coefficients is None else moved(model, shape.coefficients, others)
    return Judged(closed, change, position in model.exposure_indices)


def _shapes(judged: list[Judged]) -> Table:
    rows: list[tuple[Cell, ...]] = []
    untold = False
    for one in judged:
        closed = one.closed
        shift = told_shift(closed.line, closed.second.columns.origin)
        untold |= shift is None
        rows.append(
            (
                closed.line.label,
                shift,
                say("powers-shape", powers=list(closed.first.powers)),
                say("powers-shape", powers=list(closed.second.powers)),
                say("powers-shape", powers=list(closed.chosen)),
                one.moved.before if one.moved else None,
                one.moved.after if one.moved and one.curved else None,
            )
        )
    notes = [say("shift-untold")] if untold else []
    notes += [say("powers-unsettled")] if any(one.closed.unsettled for one in judged) else []
    columns = (
        TableColumn("column", say("form-heading-column")),
        TableColumn("shift", say("asked-form-shift"), "number"),
        TableColumn("power", say("powers-best-one")),
        TableColumn("pair", say("powers-best-two")),
        TableColumn("chosen", say("powers-chosen")),
        TableColumn("before", say("form-heading-exposure-with-line"), "odds_ratio"),
        TableColumn("after", say("form-heading-exposure-with-curve"), "odds_ratio"),
    )
    return Table("fractional_polynomials", say("powers-shapes"), columns, tuple(rows), " ".join(notes))


def _tests(judged: list[Judged]) -> Table:
    columns = (
        TableColumn("column", say("form-heading-column"), said_once=True),
        TableColumn("against", say("powers-against")),
        TableColumn("statistic", say("form-heading-likelihood-ratio"), "number"),
        TableColumn("df", say("form-heading-degrees-of-freedom"), "number"),
        TableColumn("p", say("form-heading-p"), "p"),
    )
    rows: list[tuple[Cell, ...]] = []
    for one in judged:
        closed = one.closed
        steps = {
            "powers-against-nothing": closed.against_nothing,
            "powers-against-line": closed.against_line,
            "powers-against-one": closed.against_one,
        }
        rows += [(closed.line.label, say(code), step.statistic, step.df, step.p) for code, step in steps.items()]
    blocks = tuple(block for block in range(len(judged)) for _ in range(3))
    return Table("closed_test_of_powers", say("powers-tests"), columns, tuple(rows), blocks=blocks)


def _figure(model: FittedModel, one: Judged) -> CurveFigure | None:
    shape, line = one.closed.shape, one.closed.line
    if shape.covariance is None:
        return None
    facts = {"column": line.label, "powers": list(shape.powers), "chosen": one.curved}
    return odds_curve(
        model,
        line,
        shape.log_odds,
        identity=f"powers-{line.position}",
        title=say("powers-figure-title", **facts),
        alt=say("powers-figure-alt", **facts),
    )
