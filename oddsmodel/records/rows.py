"""The rows that hold a value: what the first of them are called in messages, and how many there are."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

ROWS_NAMED = 5
Positions = NDArray[np.intp]
Weights = NDArray[np.int64]


class Rows(Protocol):
    """The rows behind the values (n,) of a column, of which each may stand for several rows that hold it."""

    @property
    def weights(self) -> Weights | None:
        """How many rows each value (n,) stands for; None where each is one row."""

    def first(self, at: Positions) -> tuple[list[int], Positions]:
        """What the first rows are called, five at most, that hold one of the values at rising positions; and the
        position of the value of each."""

    def total(self, at: Positions) -> int:
        """How many rows hold one of the values at these positions."""


@dataclass(frozen=True, slots=True)
class RowsInOrder:
    """Each value is one row, in the order of the file; first_row: what the first is called."""

    first_row: int = 2

    @property
    def weights(self) -> Weights | None:
        return None

    def first(self, at: Positions) -> tuple[list[int], Positions]:
        named = at[:ROWS_NAMED]
        return [int(row) + self.first_row for row in named], named

    def total(self, at: Positions) -> int:
        return len(at)


def occurrences(codes: Positions, size: int, weights: Weights | None = None) -> Weights:
    """How many rows have each code from 0 up (size,). codes (n,): -1 and -2 are passed over; weights (n,)."""
    return np.bincount(codes + 2, weights, minlength=size + 2)[2:].astype(np.int64, copy=False)
