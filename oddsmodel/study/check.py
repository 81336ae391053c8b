"""Everything about a plan but fitting."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.database import is_database
from oddsmodel.plan.faults import fault
from oddsmodel.plan.read import PlanFile, read_plan
from oddsmodel.progress import Progress, Silent
from oddsmodel.records.load import load_from_database, load_records
from oddsmodel.records.outcome import code_outcome
from oddsmodel.study.data import RecordsInMemory, StudyRecords
from oddsmodel.study.prepare import Prepared, prepare
from oddsmodel.study.room import allowed, wanted


@dataclass(frozen=True)
class CheckedPlan:
    """A plan whose records were read and whose models were prepared without a fault."""

    file: PlanFile
    data: StudyRecords
    models: tuple[Prepared, ...]

    @property
    def findings(self) -> tuple[Finding, ...]:
        """What the records and the designs have to say, each finding once."""
        found: dict[str, Finding] = {}
        for one in (*self.data.findings, *(item for model in self.models for item in model.findings)):
            found.setdefault(one.message, one)
        return tuple(found.values())


def check_plan(plan_path: Path, progress: Progress | None = None, *, records: Path | None = None) -> CheckedPlan:
    """Read and vet a plan against its records in memory; InputFault with all faults together."""
    progress = progress or Silent()
    return _in_memory(read_plan(plan_path), plan_path, progress, records)


@contextmanager
def opened_plan(
    plan_path: Path, progress: Progress, *, records: Path | None = None, workers: str | None = None
) -> Iterator[CheckedPlan]:
    """The same wherever the records have to be, as long as the context lasts.

    Records that would not fit into the memory that the run may use stay on disk; with workers (the address of a
    scheduler, or "local"), they are gathered there.
    """
    progress.stage("reading")
    file = read_plan(plan_path)
    source = file.plan.records.source
    path = records or plan_path.parent / source
    database = records is None and is_database(source)
    if workers is not None:
        if database:
            raise InputFault(fault("database-not-on-workers", "the plan, [records] source"))
        from oddsmodel.study.streamed.on_workers import opened_on_workers
        from oddsmodel.study.streamed.workers import connected

        with (
            connected(workers) as client,
            opened_on_workers(file, path, allowed(file.plan), client, progress) as checked,
        ):
            yield checked
        return
    needed = None if database else wanted(path)
    if needed is not None and needed > allowed(file.plan):
        from oddsmodel.study.streamed.open import opened

        with opened(file, path, allowed(file.plan), progress) as checked:
            yield checked
        return
    yield _in_memory(file, plan_path, progress, records)


def _in_memory(file: PlanFile, plan_path: Path, progress: Progress, records: Path | None) -> CheckedPlan:
    progress.stage("reading")
    source = file.plan.records.source
    if records is None and is_database(source):
        loaded = load_from_database(plan_path.parent, file.plan, progress)
    else:
        loaded = load_records(records or plan_path.parent / source, file.plan, progress)
    outcome = code_outcome(loaded, file.plan.outcome)
    return CheckedPlan(file, RecordsInMemory(file.plan, loaded, outcome), prepare(file.plan, loaded, outcome))
