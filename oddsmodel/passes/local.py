"""Passes on all cores of this machine, over rows that a source reads task by task."""

from __future__ import annotations

import os
from collections import deque
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from functools import cache
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from oddsmodel.passes.base import (
    LEAF_ROWS,
    TASK_HEIGHT,
    TASK_ROWS,
    Answer,
    Kernel,
    Leaf,
    Made,
    Tree,
    Work,
    cut,
    joined,
)
from oddsmodel.passes.work import answers_of, made_of, products

AHEAD = 2
"""Tasks in progress or waiting to be taken up, a core: what they hold bounds the memory."""


class Source(Protocol):
    """Rows that can be read in any order, by several threads at once."""

    rows: int

    def read(self, first: int, last: int) -> Leaf:
        """The rows first to last − 1."""

    def only(self, names: Sequence[str]) -> Source:
        """The same rows with these arrays alone."""

    def selected(self, mask: str) -> Source:
        """The rows for which the array of this name is true, without that array."""


@cache
def _workers() -> ThreadPoolExecutor | None:
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else (os.cpu_count() or 1)
    return ThreadPoolExecutor(cores, thread_name_prefix="oddsmodel-pass") if cores > 1 else None


def in_order(task: Callable[[int], Any], items: Sequence[int]) -> Iterator[Any]:
    """The results of a task for every item, in order, on all cores; few of them in progress at a time."""
    workers = _workers() if len(items) > 1 else None
    with products().limit(limits=1, user_api="blas"):
        if workers is None:
            yield from map(task, items)
            return
        most = AHEAD * workers._max_workers
        waiting: deque[Future[Any]] = deque()
        try:
            for item in items:
                waiting.append(workers.submit(task, item))
                if len(waiting) >= most:
                    yield waiting.popleft().result()
            while waiting:
                yield waiting.popleft().result()
        finally:
            for future in waiting:
                future.cancel()


class LocalPasses:
    """Passes over a source. Matrix products inside run on one thread each: bits do not depend on the cores."""

    def __init__(self, source: Source, makers: tuple[Made, ...] = ()) -> None:
        self.source, self.makers = source, makers
        self.rows = source.rows

    def reduce(self, kernels: Sequence[Kernel], state: Any) -> list[Answer]:
        def task(first: int) -> list[Answer]:
            rows = self.source.read(first, min(first + TASK_ROWS, self.rows))
            return answers_of(rows, self.makers, kernels, state)

        tree = Tree()
        for answers in self._in_order(task):
            tree.add(answers, TASK_HEIGHT)
        return tree.total()

    def each(self, work: Work, state: Any = None) -> Iterator[Any]:
        def task(first: int) -> Any:
            rows = self.source.read(first, min(first + TASK_ROWS, self.rows))
            return work(made_of(rows, self.makers), first, state)

        return self._in_order(task)

    def _in_order(self, task: Callable[[int], Any]) -> Iterator[Any]:
        return in_order(task, range(0, max(self.rows, 1), TASK_ROWS))

    def mapped(self, made: Made) -> LocalPasses:
        return LocalPasses(self.source, (*self.makers, made))

    def kept(self) -> LocalPasses:
        return self

    def only(self, names: Sequence[str]) -> LocalPasses:
        if self.makers:
            raise TypeError("arrays are chosen before anything is made of them")
        return LocalPasses(self.source.only(names))

    def selected(self, mask: str) -> LocalPasses:
        if self.makers:
            raise TypeError("rows are selected before anything is made of them")
        return LocalPasses(self.source.selected(mask))

    def thinned(self, leaves: int) -> LocalPasses:
        total = -(-self.rows // LEAF_ROWS)
        if total <= leaves:
            return self
        chosen = np.linspace(0, total - 2, leaves).astype(int)
        parts = [self.source.read(leaf * LEAF_ROWS, (leaf + 1) * LEAF_ROWS) for leaf in chosen.tolist()]
        return LocalPasses(MemorySource(joined(parts)), self.makers)

    def taken(self, positions: Sequence[int]) -> Leaf:
        wanted = np.asarray(positions, dtype=np.int64)
        order = np.argsort(wanted, kind="stable")
        tasks = wanted[order] // TASK_ROWS
        parts = []
        for task in np.unique(tasks).tolist():
            first = task * TASK_ROWS
            rows = self.source.read(first, min(first + TASK_ROWS, self.rows))
            parts.append(made_of(cut(rows, wanted[order][tasks == task] - first), self.makers))
        back = np.empty_like(order)
        back[order] = np.arange(order.size)
        return cut(joined(parts), back)


class MemorySource:
    """Named arrays that share their first axis; views of them are read, never copies."""

    def __init__(self, arrays: dict[str, NDArray[Any]]) -> None:
        lengths = {array.shape[0] for array in arrays.values()}
        if len(lengths) != 1:
            raise ValueError(f"arrays of one length are needed, not of {sorted(lengths)}")
        self.arrays = arrays
        self.rows = lengths.pop()

    def read(self, first: int, last: int) -> Leaf:
        return cut(self.arrays, slice(first, last))

    def only(self, names: Sequence[str]) -> MemorySource:
        return MemorySource({name: self.arrays[name] for name in names})

    def selected(self, mask: str) -> MemorySource:
        chosen = self.arrays[mask]
        rest = {name: array for name, array in self.arrays.items() if name != mask}
        return MemorySource(rest if chosen.all() else cut(rest, chosen))
