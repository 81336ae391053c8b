"""What the tasks of a cluster do, each in a thread of whatever worker holds the rows. Nothing here changes rows."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from dataclasses import dataclass
from threading import Lock
from typing import Any

import numpy as np
from numpy.typing import NDArray

from oddsmodel.passes.base import TASK_HEIGHT, TASK_ROWS, Answer, Kernel, Leaf, Made, Tree, Work, cut, joined, length_of
from oddsmodel.passes.work import answers_of, made_of, products


@dataclass(frozen=True)
class Told:
    """What the driver has to know of a block: rows; how many are true in each mask; bytes that a row of each takes."""

    rows: int
    true: Mapping[str, int]
    bytes: Mapping[str, int]


@dataclass(frozen=True)
class Reduced:
    """Kernels and their state, sent once for all partitions."""

    makers: tuple[Made, ...]
    kernels: tuple[Kernel, ...]
    state: Any


@dataclass(frozen=True)
class Worked:
    """Work and its state, sent once for all tasks."""

    makers: tuple[Made, ...]
    work: Work
    state: Any


class _OneThread:
    """Holds matrix products to one thread while any task of this process is at work, and no longer.

    The limit is one of the process: a task that lifted it on its way out would lift it for those still at work. Only
    the thread that set it can lift it, so it is a thread of its own.
    """

    def __init__(self) -> None:
        self._lock, self._inside = Lock(), 0
        self._keeper: ThreadPoolExecutor | None = None
        self._limit: Any = None

    @contextmanager
    def __call__(self) -> Iterator[None]:
        with self._lock:
            self._inside += 1
            if self._inside == 1:
                self._keeper = self._keeper or ThreadPoolExecutor(1, thread_name_prefix="oddsmodel-one-thread")
                self._limit = self._keeper.submit(_limited).result()
        try:
            yield
        finally:
            with self._lock:
                self._inside -= 1
                if self._inside == 0 and self._keeper is not None:
                    self._keeper.submit(self._limit.__exit__, None, None, None).result()


def _limited() -> Any:
    return products().limit(limits=1, user_api="blas").__enter__()


one_thread = _OneThread()


def same(sent: Any) -> Any:
    """What is sent to the workers once, and passed on among them."""
    return sent


def told(rows: Leaf) -> Told:
    """See `Told`."""
    true = {name: int(np.count_nonzero(array)) for name, array in rows.items() if array.dtype == np.bool_}
    return Told(length_of(rows), true, {name: _row_bytes(array) for name, array in rows.items()})


def picked(rows: Leaf, first: int, last: int, names: Sequence[str] | None, mask: str | None) -> Leaf:
    """The rows first to last − 1 of those that a mask selects, with some of the arrays."""
    wanted = {name: rows[name] for name in (rows if names is None else names) if name != mask}
    if mask is None:
        return cut(wanted, slice(first, last))
    return cut(wanted, np.flatnonzero(rows[mask])[first:last])


def between(pieces: Sequence[Leaf], first: int, last: int) -> Leaf:
    """The rows first to last − 1 of some pieces, one after another."""
    parts = []
    for piece in pieces:
        number = length_of(piece)
        if first < number and last > 0:
            parts.append(cut(piece, slice(max(first, 0), last)))
        first, last = first - number, last - number
    # Arrays that came over the network may lie anywhere in memory.
    rows = joined(parts or [cut(pieces[0], slice(0, 0))])
    return {name: np.require(array, requirements=("C", "A")) for name, array in rows.items()}


def kept(pieces: Sequence[Leaf], first: int, last: int, sent: tuple[Made, ...]) -> Leaf:
    """What the makers make of the rows of a span."""
    with one_thread():
        spans = [(start, min(start + TASK_ROWS, last)) for start in range(first, max(last, first + 1), TASK_ROWS)]
        return joined([made_of(between(pieces, *span), sent) for span in spans])


def answers(pieces: Sequence[Leaf], first: int, last: int, sent: Reduced) -> list[Answer]:
    """The answers over a partition, which is a subtree of whole tasks."""
    tree = Tree()
    with one_thread():
        for start in range(first, max(last, first + 1), TASK_ROWS):
            rows = between(pieces, start, min(start + TASK_ROWS, last))
            tree.add(answers_of(rows, sent.makers, sent.kernels, sent.state), TASK_HEIGHT)
    return tree.total()


def combined(parts: Sequence[list[Answer]], height: int) -> list[Answer]:
    """The answers of neighbouring partitions of some height in one."""
    tree = Tree()
    for part in parts:
        tree.add(part, height)
    return tree.total()


def worked(pieces: Sequence[Leaf], first: int, last: int, number: int, sent: Worked) -> Any:
    """The result of the work for the rows of a task, the first of them number `number` of all."""
    with one_thread():
        return sent.work(made_of(between(pieces, first, last), sent.makers), number, sent.state)


def few(pieces: Sequence[Leaf], first: int, last: int, at: NDArray[np.int64], sent: tuple[Made, ...]) -> Leaf:
    """A few rows by their places in a partition."""
    with one_thread():
        return made_of(cut(between(pieces, first, last), at), sent)


def _row_bytes(array: NDArray[Any]) -> int:
    return int(array.dtype.itemsize * np.prod(array.shape[1:], dtype=np.int64))


def row_bytes(rows: Leaf) -> int:
    """The bytes that a row takes."""
    return sum(_row_bytes(array) for array in rows.values())
