"""Records counted by the values of some columns, wherever the records are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.arithmetic import Expression
from oddsmodel.design.coded import CodedRows
from oddsmodel.design.evaluate import evaluate
from oddsmodel.design.levels import LevelSource
from oddsmodel.design.reading import Reader
from oddsmodel.design.training import MOST_VALUES, ValueSums, merged_values, rounded, rows_at
from oddsmodel.model.kept import KeptRecords
from oddsmodel.model.rows import COLUMN, Array, Levels, columns_among, frame_of
from oddsmodel.passes import Leaf, Passes
from oddsmodel.passes.base import length_of

Bits = NDArray[np.int64]


class CountedPeople:
    """Records in a pass ("event", "count" where rows have one, record columns), counted where they are."""

    def __init__(self, passes: Passes, levels: Levels) -> None:
        self.passes, self.levels = passes, levels
        self._known: dict[tuple[str, ...], KeptRecords] = {}

    def of(self, *names: str) -> KeptRecords:
        """The records counted by the values of these columns and by outcome, as many rows as there are combinations.

        Combinations with more than 2^20 different numbers are counted by numbers rounded to 12 binary digits.
        """
        if names not in self._known:
            self._known[names] = self._counted(names)
        return self._known[names]

    def _counted(self, names: tuple[str, ...]) -> KeptRecords:
        parts: list[_Table] = []
        waiting, over = 0, False
        for part in self.passes.each(_ByValue(names, self.levels)):
            parts.append(_near(part, self.levels) if over else part)
            waiting += part.counts.size
            if waiting > MOST_VALUES:
                whole = _joined(parts)
                over = over or whole.counts.size > MOST_VALUES
                parts = [_near(whole, self.levels) if over else whole]
                waiting = parts[0].counts.size
        found = _joined(parts)
        frame = frame_of({COLUMN + name: found.columns[name] for name in names}, self.levels)
        return KeptRecords(frame, found.event, found.counts)


@dataclass(frozen=True)
class _Table:
    """columns: for each name its values (j,); event (j,); counts (j,): how many records have them."""

    columns: dict[str, NDArray[Any]]
    event: NDArray[np.bool_]
    counts: Array


@dataclass(frozen=True)
class _ByValue:
    names: tuple[str, ...]
    levels: Levels

    def __call__(self, rows: Leaf, first: int, state: None) -> _Table:
        count = rows.get("count")
        weights = np.ones(length_of(rows)) if count is None else count
        return _summed(_Table({name: rows[COLUMN + name] for name in self.names}, rows["event"], weights))


def _joined(parts: Sequence[_Table]) -> _Table:
    return _summed(
        _Table(
            {name: np.concatenate([part.columns[name] for part in parts]) for name in parts[0].columns},
            np.concatenate([part.event for part in parts]),
            np.concatenate([part.counts for part in parts]),
        )
    )


def _near(table: _Table, levels: Levels) -> _Table:
    """With its numbers rounded."""
    near = {name: x if name in levels else rounded(x) for name, x in table.columns.items()}
    return _summed(_Table(near, table.event, table.counts))


def _summed(table: _Table) -> _Table:
    """Equal combinations together, in the order of their values."""
    place = np.zeros(table.event.size, dtype=np.int64)
    size = 1
    kinds: list[NDArray[Any]] = []
    for values in (*table.columns.values(), table.event):
        found, codes = _coded(values)
        if size * len(found) > 2**62:
            again, place = np.unique(place, return_inverse=True)
            size = again.size
        place = place * len(found) + codes
        size *= len(found)
        kinds.append(found)
    if size <= 4 * place.size + 1024:
        sums = np.bincount(place, weights=table.counts, minlength=size)
        first = np.full(size, -1, dtype=np.int64)
        first[place[::-1]] = np.arange(place.size - 1, -1, -1)
        there = np.flatnonzero((first >= 0) & (sums > 0))
        first, sums = first[there], sums[there]
    else:
        _, first, codes = np.unique(place, return_index=True, return_inverse=True)
        sums = np.bincount(codes, weights=table.counts)
        there = np.flatnonzero(sums > 0)
        first, sums = first[there], sums[there]
    columns = {name: values[first] for name, values in table.columns.items()}
    return _Table(columns, table.event[first], sums.astype(np.float64))


def _coded(values: NDArray[Any]) -> tuple[NDArray[Any], Bits]:
    """The different values, rising (numbers not recorded last), and the place of each."""
    if values.dtype.kind in "iub" and values.size:
        low = int(values.min())
        return np.arange(low, int(values.max()) + 1), values.astype(np.int64) - low
    codes, found = pd.factorize(values, sort=True, use_na_sentinel=False)
    return np.asarray(found), np.asarray(codes, dtype=np.int64)


class PassesTraining:
    """The training records of a design, in a pass. `where` is the place of the formula."""

    def __init__(self, passes: Passes, levels: Levels, where: str) -> None:
        self.passes, self.levels = passes, levels
        self.reader = Reader(CodedRows({}, levels), where)
        self._known: dict[Expression, tuple[Array, Array]] = {}

    def values(self, expression: Expression) -> tuple[Array, Array]:
        """See `Training`."""
        if expression not in self._known:
            work = _ValuesOf(expression, self.levels, self.reader.where)
            sums = ValueSums()
            for x, counts in self.passes.each(work):
                sums.add(x, counts)
            self._known[expression] = sums.result()
        return self._known[expression]

    def at_levels(self, source: LevelSource, levels: tuple[str, ...]) -> Array:
        """See `Training`."""
        total = np.zeros(len(levels))
        for some in self.passes.each(_AtLevels(source, levels, self.levels, self.reader.where)):
            total += some
        return total

    def check(self, expression: Expression) -> None:
        """See `Training`: told when the rows are encoded."""


@dataclass(frozen=True)
class _ValuesOf:
    expression: Expression
    levels: Levels
    where: str

    def __call__(self, rows: Leaf, first: int, state: None) -> tuple[Array, Array]:
        reader = reader_of(rows, self.levels, first, self.where)
        x = np.broadcast_to(evaluate(self.expression, reader), (reader.records,))
        return merged_values(x, rows.get("count"))


def recorded_values(passes: Passes, name: str) -> tuple[Array, Array]:
    """The distinct recorded values (j,) of a number column, rising, and how many records have each (j,)."""
    sums = ValueSums()
    for x, counts in passes.each(_Recorded(COLUMN + name)):
        sums.add(x, counts)
    return sums.result()


@dataclass(frozen=True)
class _Recorded:
    name: str

    def __call__(self, rows: Leaf, first: int, state: None) -> tuple[Array, Array]:
        x, count = rows[self.name], rows.get("count")
        recorded = np.isfinite(x)
        return merged_values(x[recorded], None if count is None else count[recorded])


@dataclass(frozen=True)
class _AtLevels:
    source: LevelSource
    wanted: tuple[str, ...]
    levels: Levels
    where: str

    def __call__(self, rows: Leaf, first: int, state: None) -> Array:
        codes = self.source.codes(reader_of(rows, self.levels, first, self.where), self.wanted)
        return rows_at(codes, len(self.wanted))


def reader_of(rows: Leaf, levels: Levels, first: int, where: str) -> Reader:
    """A reader of the record columns of some rows, the first of them number `first`."""
    arrays = {name[len(COLUMN) :]: array for name, array in columns_among(rows).items()}
    return Reader(CodedRows(arrays, levels, first), where)
