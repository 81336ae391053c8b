"""What a design learns from its training records: the values of a number with their frequencies, and those of levels.

Everything that is remembered (means, deviations, knots, levels) comes from distinct values and their true frequencies,
so that it is the same to the last bit whether the records are in memory, on disk or on workers.
"""

from __future__ import annotations

from typing import Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.arithmetic import ColumnValue, Expression
from oddsmodel.design.evaluate import evaluate
from oddsmodel.design.levels import LevelSource
from oddsmodel.design.reading import Array, Reader
from oddsmodel.design.weighted import weighted_deviation

MOST_VALUES = 1 << 20
"""Of more distinct values than this, those rounded to `BITS` binary digits are taken."""

BITS = 12
FEW_LEVELS = 16


class Training(Protocol):
    """The training records of a design, wherever they are. `reader.where` is the place of the formula."""

    reader: Reader

    def values(self, expression: Expression) -> tuple[Array, Array]:
        """The distinct values (j,) of an expression, rising, and how many records have each (j,).

        InputFault where a column is not recorded or the expression has no value.
        """

    def at_levels(self, source: LevelSource, levels: tuple[str, ...]) -> NDArray[np.float64]:
        """How many rows are at each level."""

    def check(self, expression: Expression) -> None:
        """InputFault where a record has no value of the expression, as far as that is known before encoding."""


def deviation(training: Training, column: str, *, lost: int) -> float:
    """Standard deviation of a column (divisor: records less `lost`), 0 where all are equal."""
    x, counts = training.values(ColumnValue(column))
    return weighted_deviation(x, counts, lost=lost)


class FrameTraining:
    """Training records in a frame of n rows. counts (n,): true frequencies, each row counted so often."""

    def __init__(self, frame: pd.DataFrame, where: str, counts: Array | None) -> None:
        self.reader = Reader(frame, where)
        self.counts = counts
        self._known: dict[Expression, tuple[Array, Array]] = {}

    def values(self, expression: Expression) -> tuple[Array, Array]:
        if expression not in self._known:
            x = np.broadcast_to(evaluate(expression, self.reader), (self.reader.records,))
            self._known[expression] = merged_values(x, self.counts)
        return self._known[expression]

    def at_levels(self, source: LevelSource, levels: tuple[str, ...]) -> NDArray[np.float64]:
        return rows_at(source.codes(self.reader, levels), len(levels))

    def check(self, expression: Expression) -> None:
        evaluate(expression, self.reader)


def rows_at(codes: NDArray[np.integer], levels: int) -> NDArray[np.float64]:
    """How many of the codes (n,), 0 to levels − 1, are each of these."""
    if codes.dtype.itemsize == 1 and levels <= FEW_LEVELS:
        # Short codes are compared many at a time; to be counted in one go they would have to be widened.
        return np.array([np.count_nonzero(codes == code) for code in range(levels)], dtype=np.float64)
    return np.bincount(codes, minlength=levels).astype(np.float64)


class ValueSums:
    """Distinct values with the sums of their counts, gathered part by part; rounded as soon as more than `most`."""

    def __init__(self, most: int = MOST_VALUES) -> None:
        self.most = most
        self.over = False
        self._parts: list[tuple[Array, Array]] = []
        self._waiting = 0

    def add(self, x: Array, counts: Array | None) -> None:
        """Values (n,) and how often each counts (n,), once where None."""
        distinct, sums = _summed(x, counts)
        if self.over:
            distinct, sums = _summed(rounded(distinct), sums)
        self._parts.append((distinct, sums))
        self._waiting += distinct.size
        if self._waiting > self.most:
            self._merge()

    def _merge(self) -> None:
        if len(self._parts) > 1:
            x = np.concatenate([part[0] for part in self._parts])
            self._parts = [_summed(x, np.concatenate([part[1] for part in self._parts]))]
        if self._parts and self._parts[0][0].size > self.most:
            self.over = True
            self._parts = [_summed(rounded(self._parts[0][0]), self._parts[0][1])]
        self._waiting = self._parts[0][0].size if self._parts else 0

    def result(self) -> tuple[Array, Array]:
        """The values (j,), rising, and their counts (j,)."""
        self._merge()
        return self._parts[0] if self._parts else (np.empty(0), np.empty(0))


def merged_values(x: Array, counts: Array | None, *, most: int = MOST_VALUES) -> tuple[Array, Array]:
    """The distinct values of x (n,), rising, with the sums of their counts; rounded where more than `most`."""
    sums = ValueSums(most)
    sums.add(x, counts)
    return sums.result()


def rounded(x: Array) -> Array:
    """x to `BITS` binary digits."""
    mantissa, exponent = np.frexp(x)
    return np.asarray(np.ldexp(np.rint(np.ldexp(mantissa, BITS)), exponent - BITS))


def _summed(x: Array, counts: Array | None) -> tuple[Array, Array]:
    # Adding 0 turns -0 into 0.
    ordered = x + 0.0
    if counts is None:
        ordered.sort()
        weights = None
    else:
        order = np.argsort(ordered, kind="stable")
        ordered, weights = ordered[order], counts[order]
    starts = (
        np.flatnonzero(np.concatenate([[True], ordered[1:] != ordered[:-1]])) if ordered.size else np.array([], int)
    )
    if weights is None:
        sums = np.diff(np.append(starts, ordered.size)).astype(np.float64)
    else:
        sums = np.add.reduceat(weights, starts) if starts.size else weights
    kept = sums > 0.0
    return ordered[starts][kept], sums[kept]
