"""What a pass costs, how much of the machine it uses, and how many passes a model takes.

Run: python tests/benchmarks/costs.py [--quick] [--records 1000000]     (about two minutes)
"""

from __future__ import annotations

import argparse
import os
import time
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import Any

import numpy as np
from made import records
from threadpoolctl import threadpool_limits
from timing import machine

from oddsmodel.inference import certify, maximise, profile_intervals
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.passes import MemoryPasses

LEAF = 4096
"""Rows of a leaf."""


def fastest(work: Callable[[], Any], runs: int, clock: Callable[[], float] = time.process_time) -> float:
    """Least time of several runs in seconds of all cores together: what it takes when nothing else is in the way."""
    times = []
    for _ in range(runs):
        start = clock()
        work()
        times.append(clock() - start)
    return min(times)


class Machine:
    """Rates of one core while all are at the same work: matrix products in Gflop/s, memory in Gbyte/s."""

    def __init__(self, cores: int, runs: int, size: int) -> None:
        self.cores = cores
        square = np.random.default_rng(0).normal(size=(size, size))
        long = [np.ones(8 * size * size) for _ in range(cores)]
        other = [np.empty_like(array) for array in long]
        with threadpool_limits(1, "blas"):
            self.products = 2 * size**3 / self._each(lambda core: square @ square, runs) / 1e9
        self.reading = long[0].nbytes / self._each(lambda core: long[core].sum(), runs) / 1e9
        self.copying = 2 * long[0].nbytes / self._each(lambda core: np.copyto(other[core], long[core]), runs) / 1e9

    def _each(self, work: Callable[[int], Any], runs: int) -> float:
        """Seconds a core, all cores at it."""
        with ThreadPoolExecutor(self.cores) as pool:
            return fastest(lambda: list(pool.map(work, range(self.cores))), runs) / self.cores


class Leaf:
    """Nanoseconds a row of what a leaf needs, on one core: matrix products of its shapes, and the rest of a value."""

    def __init__(self, p: int, k: int, runs: int) -> None:
        rng = np.random.default_rng(0)
        X, beta, risk = rng.normal(size=(LEAF, p)), rng.normal(size=(k, p)), rng.normal(size=(k, LEAF))
        one, root, rooted = beta[:1], rng.random((LEAF, 1)), np.empty((LEAF, p))
        couples = rng.normal(size=(p * (p + 1) // 2, 512))
        with threadpool_limits(1, "blas"):

            def each(work: Callable[[], Any], rows: int = LEAF) -> float:
                return fastest(work, 20 * runs) / rows * 1e9

            self.linear_and_score = each(lambda: (beta @ X.T, risk @ X))
            self.linear_and_score_of_one = each(lambda: (one @ X.T, risk[:1] @ X))
            self.square = each(lambda: (np.multiply(X, root, out=rooted), rooted.T @ rooted))
            self.shared = each(lambda: risk[:, :512] @ couples.T, 512)
            small = BinomialLikelihood(X[:, :1], (risk[0] > 0).astype(float))
            self.value = each(lambda: small.evaluate(beta[:, :1], information=False)) / k
            self.forming = each(lambda: np.multiply(couples, couples[:1]), 512)


def passes_of(likelihood: BinomialLikelihood, p: int, runs: int, rates: Machine) -> list[str]:
    """A line a kind of pass: nanoseconds of a core a row, the model's, and shares of the machine's rates."""
    k = 2 * p
    leaf = Leaf(p, k, runs)
    rng = np.random.default_rng(1)
    beta = rng.normal(size=(k, p)) * 0.02
    square = p * (p + 1)
    kinds = (
        ("score, 1 vector", 1, False, leaf.value + leaf.linear_and_score_of_one, 4 * p),
        ("information, 1 vector", 1, True, leaf.value + leaf.linear_and_score_of_one + leaf.square, 4 * p + p + square),
        (f"score, {k} vectors", k, False, k * leaf.value + leaf.linear_and_score, 4 * p * k),
        (
            f"information, {k} vectors",
            k,
            True,
            k * leaf.value + leaf.linear_and_score + leaf.forming + leaf.shared,
            4 * p * k + square // 2 + square * k,
        ),
    )
    lines = []
    for name, vectors, information, model, flops in kinds:

        def evaluate(vectors: int = vectors, information: bool = information) -> None:
            likelihood.evaluate(beta[:vectors], information=information)

        row = fastest(evaluate, runs) / likelihood.rows * 1e9
        at_once = row * likelihood.rows / 1e9 / (rates.cores * fastest(evaluate, runs, time.perf_counter))
        model += 8 * p / rates.reading
        lines.append(
            f"  {name:26}{row:12.1f}{model:12.1f}{flops:12,}{flops / row / rates.products:12.0%}"
            f"{8 * p:12,}{8 * p / row / rates.reading:12.0%}{at_once:12.0%}"
        )
    return lines


class Counting(MemoryPasses):
    """Passes over rows in memory that are counted."""

    counted = 0

    def reduce(self, kernels: Any, state: Any) -> Any:
        self.counted += 1
        return super().reduce(kernels, state)


def counts(number: int, p: int) -> str:
    """The passes over all rows of a fit, of all its profile limits and of its certificate."""
    X, y = records("mixed", number, p)
    passes = Counting({"X": X, "events": y})
    fit = maximise(BinomialLikelihood.over(passes, p))
    after_fit = passes.counted
    profile_intervals(fit)
    after_limits = passes.counted
    certify(fit)
    return (
        f"{number:>12,}{p:>9}{after_fit:>14}{after_limits - after_fit:>9}{passes.counted - after_limits:>13}"
        f"{passes.counted:>8}"
    )


def main(arguments: Sequence[str] | None = None) -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--quick", action="store_true")
    parser.add_argument("--records", type=int, default=1_000_000)
    asked = parser.parse_args(arguments)
    number, runs, size = (20_000, 1, 100) if asked.quick else (asked.records, 7, 1500)
    widths = (5,) if asked.quick else (17, 60)
    cores = len(os.sched_getaffinity(0))
    print(machine())
    rates = Machine(cores, runs, size)
    print(
        f"A core, all of them at it: matrix products {rates.products:.0f} Gflop/s, "
        f"reading {rates.reading:.0f} and copying {rates.copying:.0f} Gbyte/s"
    )
    for p in widths:
        X, y = records("mixed", number, p)
        print(f"{number:,} records, {p} columns; nanoseconds of a core, flops and bytes a row")
        heads = ("measured", "model", "flops", "of rate", "bytes", "of rate", "cores busy")
        print(f"  {'pass':26}" + "".join(f"{head:>12}" for head in heads))
        print("\n".join(passes_of(BinomialLikelihood(X, y), p, runs, rates)), flush=True)
    print("Passes over all rows")
    print(f"{'records':>12}{'columns':>9}{'fit with gram':>14}{'limits':>9}{'certificate':>13}{'all':>8}")
    for p in widths:
        for rows in (number,) if asked.quick else (10_000, 100_000, number):
            print(counts(rows, p), flush=True)


if __name__ == "__main__":
    main()
