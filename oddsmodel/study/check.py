"""Everything about a plan but fitting."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from oddsmodel.findings import Finding
from oddsmodel.plan.database import is_database
from oddsmodel.plan.read import PlanFile, read_plan
from oddsmodel.progress import Progress, Silent
from oddsmodel.records.load import load_from_database, load_records
from oddsmodel.records.outcome import CodedOutcome, code_outcome
from oddsmodel.records.types import Records
from oddsmodel.study.prepare import Prepared, prepare


@dataclass(frozen=True)
class CheckedPlan:
    """A plan whose records were read and whose models were prepared without a fault."""

    file: PlanFile
    records: Records
    outcome: CodedOutcome
    models: tuple[Prepared, ...]

    @property
    def findings(self) -> tuple[Finding, ...]:
        """What the records and the designs have to say, each finding once."""
        found: dict[str, Finding] = {}
        for one in (*self.records.findings, *(item for model in self.models for item in model.findings)):
            found.setdefault(one.message, one)
        return tuple(found.values())


def check_plan(plan_path: Path, progress: Progress | None = None, *, records: Path | None = None) -> CheckedPlan:
    """Read and vet a plan against its records; InputFault with all faults together."""
    progress = progress or Silent()
    file = read_plan(plan_path)
    progress.stage("reading")
    source = file.plan.records.source
    if records is None and is_database(source):
        loaded = load_from_database(plan_path.parent, file.plan, progress)
    else:
        loaded = load_records(records or plan_path.parent / source, file.plan, progress)
    outcome = code_outcome(loaded, file.plan.outcome)
    return CheckedPlan(file, loaded, outcome, prepare(file.plan, loaded, outcome))
