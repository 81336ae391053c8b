"""The values that columns take, with how many records have each: found in one pass for all who ask."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike

from oddsmodel.design.training import ValueSums, merged_values
from oddsmodel.model.fitted import Array
from oddsmodel.passes import Leaf, Passes


@dataclass(frozen=True, eq=False)
class Spread:
    """values (j,), rising, and counts (j,), above 0: of how many records each is the value.

    Where a column takes more than 2^20 different values, they are rounded to 12 binary digits.
    """

    values: Array
    counts: Array

    @classmethod
    def of(cls, values: ArrayLike, counts: ArrayLike | None = None) -> Spread:
        """That of values (n,), each counted counts (n,) times, or once."""
        times = None if counts is None else np.asarray(counts, dtype=np.float64)
        return cls(*merged_values(np.asarray(values, dtype=np.float64), times))

    @cached_property
    def ends(self) -> Array:
        """Records at or below each value (j,)."""
        return np.asarray(np.cumsum(self.counts))

    def quantiles(self, shares: ArrayLike) -> Array:
        """Quantiles at the shares (q,), linear between neighbours (Hyndman & Fan 1996, definition 7)."""
        place = (self.ends[-1] - 1.0) * np.asarray(shares, dtype=np.float64)
        below = np.floor(place)
        lower = self.values[np.searchsorted(self.ends, below, side="right")]
        above = np.searchsorted(self.ends, np.ceil(place), side="right")
        upper = self.values[np.minimum(above, self.values.size - 1)]
        return np.asarray(lower + (place - below) * (upper - lower))

    def without(self, value: float) -> Spread:
        """The same without the records of one value."""
        rest = self.values != value
        return Spread(self.values[rest], self.counts[rest])

    def in_bins(self, edges: Array) -> Array:
        """Records (b,) in bins of edges (b + 1,), rising; a value on an edge lies above it, on the last below."""
        places = np.searchsorted(self.values, edges, side="left")
        places[-1] = np.searchsorted(self.values, edges[-1], side="right")
        return np.asarray(np.diff(np.concatenate([[0.0], self.ends])[places]))


@dataclass(frozen=True)
class Among:
    """A column among the arrays of a pass: an array of its own, or one column of a matrix."""

    array: str
    position: int | None = None

    def of(self, rows: Leaf) -> Array:
        values = rows[self.array]
        return values if self.position is None else values[:, self.position]


def spreads(passes: Passes, columns: Sequence[Among]) -> list[Spread]:
    """The spread of each column over the records of a pass; rows without trials count for nothing."""
    sums = [ValueSums() for _ in columns]
    for parts in passes.each(distinct_values, tuple(columns)):
        for one, (values, counts) in zip(sums, parts, strict=True):
            one.add(values, counts)
    return [Spread(*one.result()) for one in sums]


def distinct_values(rows: Leaf, first: int, columns: tuple[Among, ...]) -> list[tuple[Array, Array]]:
    """Work of a pass: the distinct values of columns, with how many records have each."""
    return [merged_values(column.of(rows), rows.get("trials")) for column in columns]
