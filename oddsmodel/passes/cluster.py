"""Passes over rows that the workers of a Dask cluster hold; answers come back, rows stay where they are."""

from __future__ import annotations

import errno
from collections import deque
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np
from numpy.typing import NDArray

from oddsmodel.passes import on_worker
from oddsmodel.passes.base import LEAF_ROWS, TASK_HEIGHT, TASK_ROWS, Answer, Kernel, Leaf, Made, Tree, Work, cut, joined
from oddsmodel.passes.local import LocalPasses, MemorySource
from oddsmodel.wording import say

if TYPE_CHECKING:
    from distributed import Client, Future

PARTITIONS = 4
"""Partitions a thread of the workers, so that none waits long for another."""

MOST_TASKS = 16
MOST_BYTES = 1 << 27
"""A partition is at most so many tasks, and takes at most so many bytes unless it is a single task."""

TOGETHER_HEIGHT = 4
TOGETHER = 1 << TOGETHER_HEIGHT
"""The answers of so many partitions are combined on a worker."""

AHEAD = 4
MOST_FETCHED = 16
"""Tasks in progress, a thread, and those whose results are fetched in one round trip."""

LOOK = 5.0
PATIENCE = 120.0
"""Every so many seconds it is looked whether there are workers, for so many without any is waited."""

Span = tuple[int, int]


@dataclass(frozen=True)
class Part:
    """Rows of a span: those first to last − 1 of some pieces, one after another."""

    pieces: list[Future[Any]]
    first: int
    last: int


class Held(Protocol):
    """Rows that workers hold."""

    @property
    def rows(self) -> int: ...

    @property
    def tasks(self) -> int:
        """The tasks of a partition, a power of two."""

    def parts(self, spans: Sequence[Span]) -> list[Part]:
        """Where the rows of each span are; no span goes beyond a partition."""


class Blocks:
    """Rows in blocks, as tasks gathered them: some arrays, and the rows that a mask selects."""

    def __init__(
        self,
        client: Client,
        blocks: Sequence[Future[Any]],
        told: Sequence[on_worker.Told],
        threads: int,
        names: tuple[str, ...] | None = None,
        mask: str | None = None,
    ) -> None:
        self.client, self.blocks, self.told, self.threads = client, blocks, told, threads
        self.names, self.mask = names, mask
        counts = [one.rows if mask is None else one.true[mask] for one in told]
        self._before = np.concatenate([[0], np.cumsum(counts, dtype=np.int64)])
        self.rows = int(self._before[-1])

    @cached_property
    def tasks(self) -> int:
        sizes = self.told[0].bytes
        return tasks_of(self.rows, sum(sizes[name] for name in self.names or sizes), self.threads)

    def parts(self, spans: Sequence[Span]) -> list[Part]:
        blocks: list[Future[Any]] = []
        firsts: list[int] = []
        lasts: list[int] = []
        numbers: list[int] = []
        for first, last in spans:
            start = max(0, int(np.searchsorted(self._before, first, side="right")) - 1)
            start = min(start, len(self.blocks) - 1)
            stop = max(start + 1, int(np.searchsorted(self._before, last, side="left")))
            before = self._before[start:stop].tolist()
            blocks += self.blocks[start:stop]
            firsts += [max(0, first - one) for one in before]
            lasts += [last - one for one in before]
            numbers.append(stop - start)
        pieces = self.client.map(on_worker.picked, blocks, firsts, lasts, names=self.names, mask=self.mask, pure=False)
        left = iter(pieces)
        return [
            Part([next(left) for _ in range(number)], 0, last - first)
            for number, (first, last) in zip(numbers, spans, strict=True)
        ]


@dataclass(frozen=True)
class Kept:
    """Rows in partitions that workers hold for as long as this is held."""

    rows: int
    tasks: int
    partitions: Sequence[Future[Any]]

    def parts(self, spans: Sequence[Span]) -> list[Part]:
        size = self.tasks * TASK_ROWS
        return [
            Part([self.partitions[first // size]], first % size, first % size + last - first) for first, last in spans
        ]


class ClusterPasses:
    """Rows on workers, as a task of Dask a partition.

    Whatever is done is a task that depends on the tasks which gathered the blocks, so that Dask makes anew, bit for
    bit, what a lost worker held. A partition is a number of whole tasks that is a power of two, so that its answer is
    that of a subtree: the same bits as in memory, for any number of workers, threads and partitions.

    A pass takes the round trip of its answers and no other; the state goes to the scheduler once and from there to
    one worker, from which the others have it.
    """

    def __init__(self, client: Client, held: Held, threads: int, makers: tuple[Made, ...] = ()) -> None:
        self.client, self.held, self.threads, self.makers = client, held, threads, makers
        self.rows = held.rows

    @classmethod
    def over(cls, client: Client, blocks: Sequence[Future[Any]]) -> ClusterPasses:
        """A pass over blocks of rows that tasks make, at least one; takes the round trip in which they are counted."""
        told = fetched(client, client.map(on_worker.told, blocks, pure=False))
        threads = max(1, sum(client.nthreads().values()))
        return cls(client, Blocks(client, tuple(blocks), told, threads), threads)

    def reduce(self, kernels: Sequence[Kernel], state: Any) -> list[Answer]:
        size = self.held.tasks * TASK_ROWS
        sent = self._sent(on_worker.Reduced(self.makers, tuple(kernels), state))
        answers = self._tasks(on_worker.answers, self._spans(size), sent)
        height = TASK_HEIGHT + self.held.tasks.bit_length() - 1
        if len(answers) > TOGETHER:
            groups = [answers[first : first + TOGETHER] for first in range(0, len(answers), TOGETHER)]
            answers = self.client.map(on_worker.combined, groups, height=height, pure=False, priority=2)
            height += TOGETHER_HEIGHT
        tree = Tree()
        for answer in fetched(self.client, answers):
            tree.add(answer, height)
        return tree.total()

    def each(self, work: Work, state: Any = None) -> Iterator[Any]:
        sent = self._sent(on_worker.Worked(self.makers, work, state))
        spans = self._spans(TASK_ROWS)
        together = min(AHEAD * self.threads, MOST_FETCHED)
        most = max(2, AHEAD * self.threads // together)
        waiting: deque[list[Future[Any]]] = deque()
        try:
            for start in range(0, len(spans), together):
                some = spans[start : start + together]
                waiting.append(self._tasks(on_worker.worked, some, sent, [first for first, _ in some]))
                if len(waiting) >= most:
                    yield from fetched(self.client, waiting.popleft())
            while waiting:
                yield from fetched(self.client, waiting.popleft())
        finally:
            release(self.client, [future for some in waiting for future in some])

    def mapped(self, made: Made) -> ClusterPasses:
        return ClusterPasses(self.client, self.held, self.threads, (*self.makers, made))

    def only(self, names: Sequence[str]) -> ClusterPasses:
        blocks = self._blocks()
        if blocks.mask is not None:
            raise TypeError("arrays are chosen before rows are selected")
        return self._of(Blocks(self.client, blocks.blocks, blocks.told, self.threads, tuple(names)))

    def selected(self, mask: str) -> ClusterPasses:
        blocks = self._blocks()
        if blocks.mask is not None:
            raise TypeError("rows are selected once")
        return self._of(Blocks(self.client, blocks.blocks, blocks.told, self.threads, blocks.names, mask))

    def kept(self) -> ClusterPasses:
        """The same rows, made once by tasks and held on the workers for as long as the passes are."""
        if not self.rows or (not self.makers and isinstance(self.held, Kept)):
            return self
        width = on_worker.row_bytes(self.taken([0]))
        tasks = tasks_of(self.rows, width, self.threads)
        if isinstance(self.held, Kept):
            tasks = self.held.tasks
        partitions = self._tasks(on_worker.kept, self._spans(tasks * TASK_ROWS), self._sent(self.makers))
        return self._of(Kept(self.rows, tasks, partitions))

    def thinned(self, leaves: int) -> LocalPasses:
        """The rows of about `leaves` leaves, brought here."""
        total = max(1, -(-self.rows // LEAF_ROWS))
        chosen = range(total) if total <= leaves else np.linspace(0, total - 2, leaves).astype(int).tolist()
        spans = [(leaf * LEAF_ROWS, min((leaf + 1) * LEAF_ROWS, self.rows)) for leaf in chosen]
        made = self._sent(self.makers)
        return LocalPasses(MemorySource(joined(fetched(self.client, self._tasks(on_worker.kept, spans, made)))))

    def taken(self, positions: Sequence[int]) -> Leaf:
        wanted = np.asarray(positions, dtype=np.int64)
        order = np.argsort(wanted, kind="stable")
        tasks = wanted[order] // TASK_ROWS
        places: list[NDArray[np.int64]] = []
        spans: list[Span] = []
        for task in np.unique(tasks).tolist() or [0]:
            first = task * TASK_ROWS
            spans.append((first, min(first + TASK_ROWS, self.rows)))
            places.append(wanted[order][tasks == task] - first)
        parts = fetched(self.client, self._tasks(on_worker.few, spans, self._sent(self.makers), places))
        back = np.empty_like(order)
        back[order] = np.arange(order.size)
        return cut(joined(parts), back)

    def _spans(self, size: int) -> list[Span]:
        return [(first, min(first + size, self.rows)) for first in range(0, max(self.rows, 1), size)]

    def _sent(self, what: Any) -> Future[Any]:
        """What all tasks of a pass share, as a task of its own: it is sent once, and made anew where it is lost."""
        return self.client.submit(on_worker.same, what, pure=False)

    def _tasks(
        self, task: Callable[..., Any], spans: Sequence[Span], sent: Future[Any], *more: Sequence[Any]
    ) -> list[Future[Any]]:
        """A task a span, on its pieces; those that use pieces up go before those that make further ones."""
        parts = self.held.parts(spans)
        pieces, firsts, lasts = zip(*((part.pieces, part.first, part.last) for part in parts), strict=True)
        return self.client.map(task, pieces, firsts, lasts, *more, sent=sent, pure=False, priority=1)

    def _blocks(self) -> Blocks:
        if self.makers or not isinstance(self.held, Blocks):
            raise TypeError("arrays and rows are chosen before anything is made of them")
        return self.held

    def _of(self, held: Held) -> ClusterPasses:
        return ClusterPasses(self.client, held, self.threads)


def tasks_of(rows: int, width: int, threads: int) -> int:
    """How many tasks a partition has, where a row takes `width` bytes: a few partitions a thread, none too large."""
    total = -(-rows // TASK_ROWS)
    tasks = 1
    while (
        2 * tasks <= MOST_TASKS
        and 2 * tasks * PARTITIONS * threads <= total
        and 2 * tasks * TASK_ROWS * width <= MOST_BYTES
    ):
        tasks *= 2
    return tasks


def fetched(client: Client, futures: Sequence[Future[Any]]) -> list[Any]:
    """The results of tasks, in order.

    Where a worker dies, Dask does its tasks again elsewhere and makes anew what they need; that is not noticed here.
    Raises what the first of them that failed has raised; OSError where several workers died of a task, one after the
    other, where no worker is left, or where the scheduler is lost. Interrupted, it takes the tasks back.
    """
    from distributed import CancelledError, KilledWorker

    try:
        _finished(client, futures)
        for future in futures:
            if future.status == "error":
                future.result()
        return list(client.gather(list(futures)))
    except KilledWorker as error:
        release(client, futures)
        raise OSError(errno.ECONNABORTED, say("workers-killed", times=error.allowed_failures + 1)) from None
    except CancelledError:
        raise OSError(errno.ECONNABORTED, say("scheduler-lost")) from None
    except BaseException:
        release(client, futures)
        raise


def _finished(client: Client, futures: Sequence[Future[Any]]) -> None:
    """Wait until tasks are done, as long as there are workers."""
    from distributed import wait

    alone = 0.0
    while True:
        try:
            with client.as_current():
                wait(list(futures), timeout=LOOK)
        except TimeoutError:
            alone = 0.0 if client.nthreads() else alone + LOOK
            if alone >= PATIENCE:
                raise OSError(errno.ECONNABORTED, say("no-workers-left")) from None
        else:
            return


def release(client: Client, futures: Sequence[Future[Any]]) -> None:
    """Take tasks back, done or not."""
    if futures and client.status == "running":
        client.cancel(list(futures))
