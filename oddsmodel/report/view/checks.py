"""Can this be relied on? At most seven lines, and the detail of each check."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.findings import Finding
from oddsmodel.report.view.sheet import FigureView, Sheets
from oddsmodel.report.view.tables import TableView
from oddsmodel.results.study import CheckResult, ModelResult
from oddsmodel.wording import say

MOST_LINES = 7
_GRAVEST_FIRST = ("caution", "look", "fine", "not applicable")


@dataclass(frozen=True, slots=True)
class CheckView:
    title: str
    verdict: str
    verdict_words: str
    line: str
    explanation: tuple[str, ...]
    figures: tuple[FigureView, ...]
    tables: tuple[TableView, ...]
    findings: tuple[Finding, ...]
    reasons: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class ChecksView:
    """`lines` stand with a sentence each; `further` are folded together."""

    lines: tuple[CheckView, ...]
    further: tuple[CheckView, ...]
    certificate: str


def checks(model: ModelResult, sheets: Sheets) -> ChecksView:
    """The checks of one model, in their order; where more than seven have a line, the gravest seven keep theirs."""
    spoken = [place for place, check in enumerate(model.checks) if check.line and check.verdict != "not applicable"]
    gravest = sorted(spoken, key=lambda place: _GRAVEST_FIRST.index(model.checks[place].verdict))
    kept = set(gravest[:MOST_LINES])
    certificate = model.certificate
    return ChecksView(
        lines=tuple(_check(check, sheets) for place, check in enumerate(model.checks) if place in kept),
        further=tuple(_check(check, sheets) for place, check in enumerate(model.checks) if place not in kept),
        certificate=say("certificate", digits=certificate.digits, condition=certificate.condition_number),
    )


def _check(check: CheckResult, sheets: Sheets) -> CheckView:
    return CheckView(
        title=check.title,
        verdict=check.verdict.replace(" ", "-"),
        verdict_words=say(f"verdict-{check.verdict}"),
        line=check.line,
        explanation=tuple(part for part in check.explanation.split("\n") if part.strip()),
        figures=sheets.figures(check.figures),
        tables=sheets.tables(check.tables),
        findings=check.findings,
        reasons=tuple(
            say("not-given", reason=reason) for reason in dict.fromkeys(check.reasons.values()) if reason != check.line
        ),
    )
