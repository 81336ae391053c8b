"""From a file that every worker of a cluster can read to prepared models over rows that stay on the workers."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

from oddsmodel.errors import InputFault
from oddsmodel.passes import Leaf
from oddsmodel.passes.cluster import ClusterPasses, fetched, release
from oddsmodel.passes.on_worker import same
from oddsmodel.plan.faults import fault
from oddsmodel.plan.read import PlanFile
from oddsmodel.progress import Progress
from oddsmodel.records.accounting import Tally
from oddsmodel.records.stream import open_stream
from oddsmodel.study.check import CheckedPlan
from oddsmodel.study.prepare import vet_models
from oddsmodel.study.streamed.gather import Gather, Gathered
from oddsmodel.study.streamed.open import checked_plan, gather_of, refuse_what_needs_memory

if TYPE_CHECKING:
    from distributed import Client


@contextmanager
def opened_on_workers(
    file: PlanFile, path: Path, memory: int, client: Client, progress: Progress
) -> Iterator[CheckedPlan]:
    """A plan with its records gathered on the workers of a client, which let go of them when it is left.

    memory: bytes that this machine keeps to; of each worker's memory a block takes no more than an eighth of it.
    InputFault as `check_plan` raises it, for what needs all records in one place, and where a worker cannot see the
    records under the same path.
    """
    plan = file.plan
    refuse_what_needs_memory(plan, "needs-one-machine")
    path = Path(os.path.abspath(path))
    stream = open_stream(path, plan, progress, memory=memory)
    _must_be_seen(path, client)
    gather = gather_of(stream, plan, vet_models(plan, stream.columns))
    progress.stage("gathering", stream.blocks_number)
    sent = client.submit(same, gather, pure=False)
    gathered = client.map(block_of, range(stream.blocks_number), gather=sent, pure=False)
    rows = client.map(rows_of, gathered, pure=False, priority=1)
    told = client.map(tallies_of, gathered, pure=False, priority=1)
    del gathered
    try:
        tallies: list[list[Tally]] = [[] for _ in gather.vetted.models]
        for future in told:
            for known, one in zip(tallies, fetched(client, [future])[0], strict=True):
                known.append(one)
            progress.advance()
        yield checked_plan(file, gather, ClusterPasses.over(client, rows), tallies)
    finally:
        release(client, [*rows, *told])


def block_of(number: int, gather: Gather) -> Gathered:
    """A block of records, read and gathered by a worker."""
    return gather(number)


def rows_of(gathered: Gathered) -> Leaf:
    """What stays on the worker."""
    return gathered.rows


def tallies_of(gathered: Gathered) -> tuple[Tally, ...]:
    """What comes back."""
    return gathered.tallies


def fingerprint(path: str) -> tuple[bool, int, int] | None:
    """Whether a path is a folder, how many files are there and how many bytes they take; None where it is nothing."""
    if not os.path.exists(path):
        return None
    if not os.path.isdir(path):
        return False, 1, os.stat(path).st_size
    files = [os.path.join(folder, name) for folder, _, names in os.walk(path) for name in names]
    return True, len(files), sum(os.stat(file).st_size for file in files)


def _must_be_seen(path: Path, client: Client) -> None:
    here = fingerprint(str(path))
    lost = [worker for worker, there in client.run(fingerprint, str(path)).items() if there != here]
    if lost:
        raise InputFault(fault("records-not-on-workers", str(path), workers=lost))
