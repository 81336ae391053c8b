"""What the workers of the tests have to import: blocks of rows, what is made of them, kernels that take their time."""

from __future__ import annotations

import os
import signal
import time

import numpy as np

from oddsmodel.errors import Fault, InputFault
from oddsmodel.likelihood.kernels import ValueKernel
from oddsmodel.passes import MemoryPasses
from oddsmodel.passes.base import Leaf, joined

BLOCK = 50_000


def block(number: int, rows: int = BLOCK) -> Leaf:
    """Invented people: age, sex (-1 where not recorded), whether the event happened, whether they belong."""
    rng = np.random.default_rng(number)
    age = rng.normal(50.0, 12.0, rows)
    risk = 1.0 / (1.0 + np.exp(2.0 - age / 50.0))
    return {
        "age": age,
        "sex": rng.integers(-1, 2, rows).astype(np.int8),
        "events": (rng.random(rows) < risk).astype(np.float64),
        "belongs": rng.random(rows) < 0.7,
        "nobody": np.zeros(rows, dtype=np.bool_),
    }


def in_memory(blocks: int) -> MemoryPasses:
    return MemoryPasses(joined([block(number) for number in range(blocks)]))


class Matrix:
    def __call__(self, rows: Leaf) -> Leaf:
        columns = (np.ones(len(rows["age"])), (rows["age"] - 50.0) / 12.0, rows["sex"] == 1)
        return {"X": np.column_stack(columns), "events": rows["events"]}


class Same:
    def __call__(self, rows: Leaf) -> Leaf:
        return rows


class Slow(ValueKernel):
    """Values that take a while."""

    def __init__(self, vectors: int, seconds: float) -> None:
        super().__init__(True, vectors)
        self.batch, self.seconds = 1, seconds

    def leaf(self, rows: Leaf, beta: np.ndarray) -> tuple[np.ndarray, ...]:
        time.sleep(self.seconds)
        return super().leaf(rows, beta)


class Deadly:
    """Kills whoever does it."""

    def leaf(self, rows: Leaf, state: None) -> tuple[np.ndarray, ...]:
        os.kill(os.getpid(), signal.SIGKILL)
        return ()


def oldest(rows: Leaf, first: int, state: float) -> tuple[int, float]:
    at = int(rows["age"].argmax())
    return first + at, float(rows["age"][at]) + state


def steepest(rows: Leaf, first: int, state: None) -> tuple[int, float]:
    return first, float(rows["X"][:, 1].max())


def refuses(rows: Leaf, first: int, state: None) -> None:
    raise InputFault([Fault("Wrong.", f"row {first + 1}", "Put it right."), Fault("Wrong again.", "here", "")])
