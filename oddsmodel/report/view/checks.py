"""Can this be relied on? At most seven lines, and the detail of each check."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.checks import speaking
from oddsmodel.findings import Finding
from oddsmodel.report.view.sheet import FigureView, Sheets
from oddsmodel.report.view.tables import TableView
from oddsmodel.results.study import CheckResult, ModelResult
from oddsmodel.wording import say


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
    """The checks of one model, in their order; one of each of the seven families speaks for it."""
    kept = [check.name for check in speaking(model.checks)]
    certificate = model.certificate
    return ChecksView(
        lines=tuple(_check(check, sheets) for check in model.checks if check.name in kept),
        further=tuple(_check(check, sheets) for check in model.checks if check.name not in kept),
        certificate=model.reasons.get("certificate")
        or say("certificate", digits=certificate.digits, condition=certificate.condition_number),
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
