"""What is done with the rows of one task, in whatever thread or process holds them."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cache
from typing import Any, cast

from oddsmodel.passes.base import LEAF_ROWS, Answer, BatchKernel, Kernel, Leaf, Made, Tree, cut, length_of

SPAN_LEAVES = 4
"""Rows are made for so many leaves at a time, so that they stay in the cache until they are read."""


@cache
def products() -> Any:
    """The libraries of matrix products, looked for once: the search takes longer than a small pass."""
    from threadpoolctl import ThreadpoolController

    return ThreadpoolController()


def made_of(rows: Leaf, makers: Sequence[Made]) -> Leaf:
    """What the makers make of some rows, one after another."""
    for make in makers:
        rows = make(rows)
    return rows


def answers_of(rows: Leaf, makers: Sequence[Made], kernels: Sequence[Kernel], state: Any) -> list[Answer]:
    """The answers of the kernels over the rows of a task, its leaves combined in their tree."""
    batch = min(getattr(kernel, "batch", 1) for kernel in kernels)
    total = length_of(rows)
    span = SPAN_LEAVES * LEAF_ROWS if makers else total
    tree = Tree()
    for start in range(0, max(total, 1), max(span, 1)):
        some = made_of(cut(rows, slice(start, start + span)), makers) if makers else rows
        _leaves(some, kernels, state, batch, tree)
    return tree.total()


def _leaves(rows: Leaf, kernels: Sequence[Kernel], state: Any, batch: int, tree: Tree) -> None:
    total = length_of(rows)
    at = 0
    while at < max(total, 1):
        number = batch if at + batch * LEAF_ROWS <= total else 1
        some = cut(rows, slice(at, at + number * LEAF_ROWS))
        if number == 1:
            tree.add([kernel.leaf(some, state) for kernel in kernels])
        else:
            answers = [cast(BatchKernel, kernel).leaves(some, number, state) for kernel in kernels]
            for one in range(number):
                tree.add([tuple(array[one] for array in answer) for answer in answers])
        at += number * LEAF_ROWS
