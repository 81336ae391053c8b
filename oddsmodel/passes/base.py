"""The contract of a pass: leaves of 4096 rows, combined in a binary tree fixed by leaf number."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

LEAF_ROWS = 4096

TASK_HEIGHT = 4
TASK_ROWS = LEAF_ROWS << TASK_HEIGHT
"""A task is a subtree of 16 leaves, whatever the number of threads or workers."""

Leaf = dict[str, NDArray[Any]]
"""Consecutive rows: each named array cut to those rows, in source order."""

Answer = tuple[NDArray[Any], ...]


class Kernel(Protocol):
    """What is computed over the rows: an answer a leaf, and answers that add up."""

    def leaf(self, rows: Leaf, state: Any) -> Answer:
        """The answer for one leaf; must not keep or change `rows`."""


class BatchKernel(Kernel, Protocol):
    """A kernel that answers for several neighbouring leaves at once, so that threads seldom wait for one another.

    batch: for how many, a power of two up to 4; what they need together should stay in the cache.
    """

    batch: int

    def leaves(self, rows: Leaf, number: int, state: Any) -> Answer:
        """The answers for `number` leaves of equal length, each array with a first axis over the leaves."""


class Work(Protocol):
    """What is done with the rows of a task where answers do not add up: the largest few, distinct values, a sample."""

    def __call__(self, rows: Leaf, first: int, state: Any, /) -> Any:
        """The result for up to `TASK_ROWS` consecutive rows, the first of them number `first`."""


class Made(Protocol):
    """Makes rows from rows, each from itself alone: a model matrix from coded columns, further columns from it.

    Must not change `rows`; can be pickled.
    """

    def __call__(self, rows: Leaf, /) -> Leaf: ...


class Passes(Protocol):
    """All rows, wherever they are."""

    rows: int

    def reduce(self, kernels: Sequence[Kernel], state: Any) -> list[Answer]:
        """One pass: the answer of each kernel over all rows, the same bits whatever does the work."""

    def each(self, work: Work, state: Any = None) -> Iterator[Any]:
        """One pass: the results of the work for every `TASK_ROWS` rows, in source order."""

    def mapped(self, made: Made) -> Passes:
        """The rows that `made` makes of these, made anew in every pass."""

    def kept(self) -> Passes:
        """The same rows; where making them anew costs more than to hold them, made once and held where they are."""

    def only(self, names: Sequence[str]) -> Passes:
        """The same rows with these arrays alone."""

    def selected(self, mask: str) -> Passes:
        """The rows for which the array of this name is true, in source order, without that array."""

    def thinned(self, leaves: int) -> Passes:
        """A pass over about `leaves` leaves, evenly spaced over the source."""

    def taken(self, positions: Sequence[int]) -> Leaf:
        """A few rows by their numbers, in the order asked for."""


def combine(one: Sequence[Answer], other: Sequence[Answer]) -> list[Answer]:
    """The answers of two neighbouring subtrees, added."""
    return [tuple(np.add(x, y) for x, y in zip(a, b, strict=True)) for a, b in zip(one, other, strict=True)]


class Tree:
    """Combines subtree answers that arrive in order, pairing (0,1), (2,3), then pairs of pairs, and so on.

    The shape depends on the number of leaves only. Holds at most one answer a level.
    """

    def __init__(self) -> None:
        self._waiting: list[tuple[int, list[Answer]]] = []

    def add(self, answers: list[Answer], height: int = 0) -> None:
        """Add the next subtree, whose leaves number two to the power `height` (the last may have fewer)."""
        while self._waiting and self._waiting[-1][0] == height:
            answers = combine(self._waiting.pop()[1], answers)
            height += 1
        self._waiting.append((height, answers))

    def total(self) -> list[Answer]:
        """The answers over everything added; at least one subtree must have been."""
        _, answers = self._waiting[-1]
        for _, earlier in reversed(self._waiting[:-1]):
            answers = combine(earlier, answers)
        return answers


def length_of(rows: Mapping[str, NDArray[Any]]) -> int:
    """The number of rows."""
    return int(next(iter(rows.values())).shape[0])


def cut(rows: Mapping[str, NDArray[Any]], span: slice | NDArray[Any]) -> Leaf:
    """Some of the rows, of every array."""
    return {name: array[span] for name, array in rows.items()}


def joined(parts: Sequence[Mapping[str, NDArray[Any]]]) -> Leaf:
    """Rows one after another."""
    if len(parts) == 1:
        return dict(parts[0])
    return {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}
