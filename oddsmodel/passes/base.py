"""The contract of a pass: leaves of 4096 rows, combined in a binary tree fixed by leaf number."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

LEAF_ROWS = 4096

Leaf = dict[str, NDArray[Any]]
"""Consecutive rows: each named array cut to the leaf's rows, in source order."""

Answer = tuple[NDArray[Any], ...]


class Kernel(Protocol):
    """What is computed over the rows: an answer a leaf, and answers that add up."""

    def leaf(self, rows: Leaf, state: Any) -> Answer:
        """The answer for one leaf; must not keep or change `rows`."""


class BatchKernel(Kernel, Protocol):
    """A kernel that answers for several neighbouring leaves at once, so that threads seldom wait for one another.

    batch: for how many, a power of two up to 16; what they need together should stay in the cache.
    """

    batch: int

    def leaves(self, rows: Leaf, number: int, state: Any) -> Answer:
        """The answers for `number` leaves of equal length, each array with a first axis over the leaves."""


class Passes(Protocol):
    """All rows, wherever they are."""

    rows: int

    def reduce(self, kernels: Sequence[Kernel], state: Any) -> list[Answer]:
        """One pass: the answer of each kernel over all rows, the same bits whatever does the work."""

    def thinned(self, leaves: int) -> Passes:
        """A pass over about `leaves` leaves, evenly spaced over the source."""


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
