"""`check`: everything but fitting, and what was found."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from oddsmodel.cli.ending import DONE, NOT_ESTIMATED
from oddsmodel.cli.progress import drawn_progress
from oddsmodel.cli.run import write_findings
from oddsmodel.cli.terminal import write
from oddsmodel.results.study import Flow
from oddsmodel.wording import say

if TYPE_CHECKING:
    from oddsmodel.study.check import CheckedPlan


def check_command(plan: Path, records: Path | None) -> int:
    """Read a plan against its records; the exit status says whether every model can be fitted as it stands."""
    from oddsmodel.study.check import opened_plan

    with drawn_progress() as progress, opened_plan(plan, progress, records=records) as checked:
        pass
    return _told(checked)


def _told(checked: CheckedPlan) -> int:
    data = checked.data
    write(say("records-were-read", source=data.source, records=data.read))
    column = checked.file.plan.outcome.column_name
    write(say("outcome-is", column=column, event=data.event_label, other=data.other_label))
    for model in checked.models:
        write()
        write(say("model-is", name=model.section.name, formula=model.section.formula))
        _write_flow(model.flow)
        if model.design is not None:
            write(say("model-has", coefficients=len(model.design.columns)), indent=2)
    write_findings(checked.findings, say("what-was-found"))

    stopped = any(model.design is None for model in checked.models)
    stopped = stopped or any(finding.severity == "stop" for finding in checked.findings)
    write()
    write(say("cannot-all-be-fitted" if stopped else "plan-not-run"))
    return NOT_ESTIMATED if stopped else DONE


def _write_flow(flow: Flow) -> None:
    for exclusion in flow.left_out:
        if exclusion.records:
            write(say("records-left-out", records=exclusion.records, reason=exclusion.reason), indent=2)
    if flow.analysed is not None:
        write(say("records-analysed", records=flow.analysed, events=flow.events), indent=2)
