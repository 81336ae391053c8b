"""`run`: the whole job, and a few lines on what came of it."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from oddsmodel.cli.ending import DONE, NOT_ESTIMATED
from oddsmodel.cli.progress import drawn_progress
from oddsmodel.cli.terminal import write
from oddsmodel.findings import Finding
from oddsmodel.progress import Silent
from oddsmodel.results.study import StudyResults
from oddsmodel.wording import say

MOST_FINDINGS = 12


def run_command(plan: Path, into: Path | None, records: Path | None, workers: str | None = None) -> int:
    """Run a plan; the exit status says whether every model was estimated. workers: see `run_plan`."""
    from oddsmodel.study.run import run_plan

    with drawn_progress() as progress:
        outcome = run_plan(plan, into=into, records=records, workers=workers, progress=progress)
    report = next((file for file in outcome.files if file.suffix == ".html"), outcome.folder)
    write(say("report-is-in", file=str(report)))
    write_answer(outcome.results)
    return NOT_ESTIMATED if outcome.not_estimated else DONE


def write_answer(study: StudyResults) -> None:
    """The answer in the report's own words, then what must be read before it is used."""
    from oddsmodel.report.view.opening import opening
    from oddsmodel.report.view.sheet import Sheets
    from oddsmodel.results.lead import is_estimated, lead_model

    lead = lead_model(study)
    undrawn = None if lead is None else replace(lead, figures=())
    view = opening(study, undrawn, Sheets(0, Silent()))

    if view.question:
        write()
        write(view.question)
    for answer in view.answers:
        write()
        if answer.label:
            write(answer.label)
        write(answer.sentence)
        if answer.compatible:
            write(answer.compatible)
        if answer.beside:
            write(answer.beside)
    for more in (view.more, view.basis, view.sampling):
        if more:
            write(more)
    write_findings((*view.stops, *view.warnings, *view.further_warnings), say("read-this-first"))

    for model in study.models:
        if model is not lead and not is_estimated(model):
            write()
            write(say("model-not-estimated", name=model.name))


def write_findings(findings: tuple[Finding, ...], heading: str) -> None:
    """A line a finding below a heading, the first of very many; nothing where there is none."""
    if not findings:
        return
    write()
    write(heading)
    for finding in findings[:MOST_FINDINGS]:
        write(f"- {say(f'severity-{finding.severity}')}: {finding.message}", indent=2)
    if len(findings) > MOST_FINDINGS:
        write(say("more-findings", number=len(findings) - MOST_FINDINGS), indent=2)
