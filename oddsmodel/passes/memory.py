"""Passes over arrays in memory, on all cores of the machine."""

from __future__ import annotations

import os
from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from functools import cache
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from oddsmodel.passes.base import LEAF_ROWS, Answer, BatchKernel, Kernel, Tree

TASK_HEIGHT = 4
"""A task is a subtree of 16 leaves, whatever the number of threads."""


@cache
def _workers() -> ThreadPoolExecutor | None:
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else (os.cpu_count() or 1)
    return ThreadPoolExecutor(cores, thread_name_prefix="oddsmodel-pass") if cores > 1 else None


@cache
def _products() -> Any:
    """The libraries of matrix products, looked for once: the search takes longer than a small pass."""
    from threadpoolctl import ThreadpoolController

    return ThreadpoolController()


class MemoryPasses:
    """Named arrays that share their first axis; views of them go to the kernels, never copies.

    Matrix products inside a kernel run on one thread each, so that bits do not depend on the machine's cores.
    """

    def __init__(self, arrays: dict[str, NDArray[Any]]) -> None:
        lengths = {array.shape[0] for array in arrays.values()}
        if len(lengths) != 1:
            raise ValueError(f"arrays of one length are needed, not of {sorted(lengths)}")
        self.arrays = arrays
        self.rows = lengths.pop()

    def reduce(self, kernels: Sequence[Kernel], state: Any) -> list[Answer]:
        leaves = max(1, -(-self.rows // LEAF_ROWS))
        task_leaves = 1 << TASK_HEIGHT
        tasks = range(0, leaves, task_leaves)
        batches = [cast(BatchKernel, kernel) for kernel in kernels]
        batch = min(getattr(kernel, "batch", 1) for kernel in kernels)

        def task(first: int) -> list[Answer]:
            tree = Tree()
            leaf, last = first, min(first + task_leaves, leaves)
            while leaf < last:
                number = batch if (leaf + batch) * LEAF_ROWS <= self.rows else 1
                span = slice(leaf * LEAF_ROWS, (leaf + number) * LEAF_ROWS)
                rows = {name: array[span] for name, array in self.arrays.items()}
                if number == 1:
                    tree.add([kernel.leaf(rows, state) for kernel in kernels])
                else:
                    answers = [kernel.leaves(rows, number, state) for kernel in batches]
                    for one in range(number):
                        tree.add([tuple(array[one] for array in answer) for answer in answers])
                leaf += number
            return tree.total()

        with _products().limit(limits=1, user_api="blas"):
            workers = _workers() if len(tasks) > 1 else None
            tree = Tree()
            for answers in map(task, tasks) if workers is None else workers.map(task, tasks):
                tree.add(answers, TASK_HEIGHT)
        return tree.total()

    def thinned(self, leaves: int) -> MemoryPasses:
        total = -(-self.rows // LEAF_ROWS)
        if total <= leaves:
            return self
        chosen = np.linspace(0, total - 2, leaves).astype(int)
        return MemoryPasses(
            {
                name: np.concatenate([array[leaf * LEAF_ROWS : (leaf + 1) * LEAF_ROWS] for leaf in chosen])
                for name, array in self.arrays.items()
            }
        )
