"""From a file that does not fit into memory to prepared models over rows in scratch files."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path

from oddsmodel.errors import InputFault
from oddsmodel.passes import Passes
from oddsmodel.passes.files import ColumnWriter, ScratchFolder
from oddsmodel.passes.local import LocalPasses, in_order
from oddsmodel.plan.faults import fault
from oddsmodel.plan.read import PlanFile
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.accounting import Tally
from oddsmodel.records.stream import RecordStream, open_stream
from oddsmodel.study.check import CheckedPlan
from oddsmodel.study.prepare import VettedModels, vet_models
from oddsmodel.study.streamed.gather import Gather
from oddsmodel.study.streamed.records import StreamedRecords, prepare_streamed
from oddsmodel.wording.plain import quoted

FOR_MODELS = ("number", "category", "ordered", "yes-no")


@contextmanager
def opened(file: PlanFile, path: Path, memory: int, progress: Progress) -> Iterator[CheckedPlan]:
    """A plan with its records gathered in scratch files, which are gone when it is left.

    memory: bytes to keep to. InputFault as `check_plan` raises it, and for what needs all records at once.
    """
    plan = file.plan
    refuse_what_needs_memory(plan)
    stream = open_stream(path, plan, progress, memory=memory)
    gather = gather_of(stream, plan, vet_models(plan, stream.columns))
    with ScratchFolder() as scratch:
        writer = ColumnWriter(scratch.path / "rows")
        tallies: list[list[Tally]] = [[] for _ in gather.vetted.models]
        progress.stage("gathering", stream.blocks_number)
        for block in in_order(gather, range(stream.blocks_number)):
            writer.write(block.rows)
            for known, one in zip(tallies, block.tallies, strict=True):
                known.append(one)
            progress.advance()
        yield checked_plan(file, gather, LocalPasses(writer.close()), tallies)


def checked_plan(file: PlanFile, gather: Gather, rows: Passes, tallies: Sequence[Sequence[Tally]]) -> CheckedPlan:
    """A plan with its models prepared over everything gathered; tallies: of every model, over all blocks."""
    columns = gather.stream.columns
    levels = {name: columns[name].levels for name in gather.columns if columns[name].levels}
    data = StreamedRecords(gather, rows, levels, file.plan.records.count is not None)
    return CheckedPlan(file, data, prepare_streamed(data, tallies))


def gather_of(stream: RecordStream, plan: StudyPlan, vetted: VettedModels) -> Gather:
    """What is gathered from each block: the columns of the models, and the sources of derived columns."""
    wanted = [*vetted.used, *(source for one in stream.derived for source in (one.name, *one.sources))]
    columns = [name for name in dict.fromkeys(wanted) if stream.columns[name].kind in FOR_MODELS]
    return Gather(stream, plan, vetted, tuple(columns))


def refuse_what_needs_memory(plan: StudyPlan, code: str = "needs-memory") -> None:
    """InputFault of a code for keys of the plan whose work needs all records at once; methods have codes of their own,
    which begin with "method-"."""
    faults = [] if plan.records.grouped_by is None else [fault(code, "the plan, [records] grouped_by")]
    for model in plan.models:
        if model.method in ("exact", "log-F"):
            faults.append(fault(f"method-{code}", f"the plan, [[models]] {quoted(model.name)} method"))
    if faults:
        raise InputFault(faults)
