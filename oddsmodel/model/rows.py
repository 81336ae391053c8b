"""The rows of a model matrix: covariate patterns where they are few enough to hold, else the records one by one."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.coded import CodedRows
from oddsmodel.design.encoder import Design
from oddsmodel.design.levels import LevelPiece
from oddsmodel.design.patterns import distinct_rows
from oddsmodel.passes import Leaf, MemoryPasses, Passes

Array = NDArray[np.float64]

COLUMN = "column:"
"""Before the name of a record column among the arrays of a pass."""

MOST_PATTERNS = 1 << 18
"""Records are taken one by one where their covariate patterns are more than this."""

MOST_CELLS = 1 << 16
"""Combinations of levels up to which each has a place of its own in a table of counts."""

Levels = Mapping[str, tuple[str, ...]]


@dataclass(frozen=True)
class Encode:
    """Makes X, events and trials (where rows have a count) from coded records; the record columns stay beside them."""

    design: Design
    levels: Levels

    def __call__(self, rows: Leaf) -> Leaf:
        return {**_counted(rows), "X": self.design.encode(coded(rows, self.levels)), **columns_among(rows)}


@dataclass(frozen=True)
class ModelRows:
    """passes: X (m, p), events (m,) and, unless every row is one record, trials (m,), row after row.

    single: whether rows are records and not covariate patterns. first_row (m,): the number of the first record of each
    pattern among the people; None where rows are single. people: the records that the model was fitted to:
    "event" (n,) true or false, "count" (n,) where rows of the file have one, and the record columns.
    levels: those of the record columns that have any.
    """

    passes: Passes
    single: bool
    first_row: NDArray[np.int64] | None
    people: Passes
    levels: Levels

    @property
    def number(self) -> int:
        return self.passes.rows

    @cached_property
    def with_columns(self) -> Passes:
        """The passes with the record columns, those of a pattern's first record."""
        if self.first_row is None or not isinstance(self.passes, MemoryPasses):
            return self.passes
        if self.first_row.size == self.people.rows and isinstance(self.people, MemoryPasses):
            return MemoryPasses({**self.passes.arrays, **columns_among(self.people.arrays)})
        return MemoryPasses({**self.passes.arrays, **columns_among(self.people.taken(self.first_row.tolist()))})

    def columns_at(self, positions: NDArray[np.int64]) -> pd.DataFrame:
        """The record columns (q rows) of a few rows; those of a pattern's first record."""
        numbers = positions if self.first_row is None else self.first_row[positions]
        return frame_of(self.people.taken(numbers.tolist()), self.levels)


def rows_of(people: Passes, design: Design, levels: Levels) -> ModelRows:
    """The rows of a design for these records, as patterns if there are at most `MOST_PATTERNS` of them.

    Whether there are, and their order (that of their first record), depends on the records alone and not on where
    they are.
    """
    encode = Encode(design, levels)
    found = _of_levels(people, encode) if _all_levels(design) else None
    if found is None:
        found = _hashed(people.mapped(encode))
    if found is not None:
        arrays, first_row = found
        return ModelRows(MemoryPasses(arrays), False, first_row, people, levels)
    passes: Passes = people.mapped(encode)
    passes = _in_memory(people, passes, len(design.columns)) if isinstance(people, MemoryPasses) else passes.kept()
    return ModelRows(passes, True, None, people, levels)


def coded(rows: Leaf, levels: Levels) -> CodedRows:
    """The record columns among some rows."""
    return CodedRows({name[len(COLUMN) :]: array for name, array in columns_among(rows).items()}, levels)


def columns_among(rows: Leaf) -> Leaf:
    """The arrays of record columns."""
    return {name: array for name, array in rows.items() if name.startswith(COLUMN)}


def frame_of(rows: Leaf, levels: Levels) -> pd.DataFrame:
    """The record columns of some rows as a frame of float64 and category columns."""
    made: dict[str, Any] = {}
    for name, array in coded(rows, levels).arrays.items():
        if name in levels:
            codes: NDArray[np.int64] = np.maximum(array, -1)
            made[name] = pd.Categorical.from_codes(codes, pd.Index(levels[name], dtype=object))
        else:
            made[name] = array
    return pd.DataFrame(made, copy=False)


def _counted(rows: Leaf) -> Leaf:
    if "count" not in rows:
        return {"events": rows["event"].astype(np.float64)}
    return {"events": rows["event"] * rows["count"], "trials": rows["count"]}


def _in_memory(people: MemoryPasses, encoded: Passes, parameters: int) -> MemoryPasses:
    X = np.empty((people.rows, parameters))

    def fill(rows: Leaf, first: int, state: None) -> None:
        X[first : first + len(rows["X"])] = rows["X"]

    for _ in encoded.each(fill):
        pass
    return MemoryPasses({"X": X, **_counted(people.arrays), **columns_among(people.arrays)})


def _all_levels(design: Design) -> bool:
    pieces = design.pieces
    cells = 1
    for piece in pieces:
        cells *= len(piece.levels) if isinstance(piece, LevelPiece) else MOST_CELLS + 1
    return cells <= MOST_CELLS


@dataclass(frozen=True)
class _CountCells:
    """Records, events and the first record of every combination of levels."""

    encode: Encode
    sizes: tuple[int, ...]

    def __call__(self, rows: Leaf, first: int, state: None) -> tuple[Array, Array, NDArray[np.int64]]:
        cells = int(np.prod(self.sizes))
        n = len(rows["event"])
        cell = np.zeros(n, dtype=np.int32)
        for codes, size in zip(self.encode.design.read(coded(rows, self.encode.levels)), self.sizes, strict=True):
            cell *= size
            cell += codes
        happened = rows["event"]
        count = rows.get("count")
        records = np.bincount(cell, weights=count, minlength=cells).astype(np.float64)
        weights = None if count is None else count[happened]
        events = np.bincount(cell[happened], weights=weights, minlength=cells).astype(np.float64)
        place = np.full(cells, np.iinfo(np.int64).max)
        place[cell[::-1]] = np.arange(first + n - 1, first - 1, -1)
        return records, events, place


def _of_levels(people: Passes, encode: Encode) -> tuple[Leaf, NDArray[np.int64]]:
    """The patterns of a design of levels alone: one table of counts a task, added up."""
    sizes = tuple(len(piece.levels) for piece in encode.design.pieces if isinstance(piece, LevelPiece))
    cells = int(np.prod(sizes))
    records, events = np.zeros(cells), np.zeros(cells)
    first = np.full(cells, np.iinfo(np.int64).max)
    for some, happened, place in people.each(_CountCells(encode, sizes)):
        records += some
        events += happened
        np.minimum(first, place, out=first)
    there = np.flatnonzero(first < np.iinfo(np.int64).max)
    there = there[np.argsort(first[there], kind="stable")]
    codes = np.unravel_index(there, sizes) if sizes else ()
    X = encode.design.matrix(list(codes), there.size)
    return _patterns(X, events[there], records[there]), first[there]


def _patterns(X: Array, events: Array, trials: Array) -> Leaf:
    return {"X": X, "events": events} if (trials == 1.0).all() else {"X": X, "events": events, "trials": trials}


@dataclass(frozen=True)
class _Some:
    """Distinct rows (q), in the order met: their hashes, X, events, trials and the number of the first of each."""

    hashes: NDArray[np.uint64]
    X: Array
    events: Array
    trials: Array
    first: NDArray[np.int64]


def _distinct(rows: Leaf, first: int, state: None) -> _Some | None:
    found = distinct_rows(rows["X"])
    if found is None:
        return None
    hashes, index, at = found
    trials = rows.get("trials")
    events = np.bincount(index, weights=rows["events"], minlength=at.size).astype(np.float64)
    return _Some(
        hashes[at],
        rows["X"][at],
        events,
        np.bincount(index, weights=trials, minlength=at.size).astype(np.float64),
        at + first,
    )


def _hashed(encoded: Passes) -> tuple[Leaf, NDArray[np.int64]] | None:
    """The patterns of any design; None from where they are more than `MOST_PATTERNS` on."""
    known: _Some | None = None
    for some in encoded.each(_distinct):
        known = some if known is None or some is None else _merged(known, some)
        if known is None or known.hashes.size > MOST_PATTERNS:
            return None
    if known is None:
        return None
    return _patterns(known.X, known.events, known.trials), known.first


def _merged(known: _Some, some: _Some) -> _Some | None:
    """Both together; None where different rows have the same hash."""
    m = known.hashes.size
    index = pd.factorize(np.concatenate([known.hashes, some.hashes]))[0][m:]
    old = index < m
    if not np.array_equal(known.X[index[old]], some.X[old]):
        return None
    events, trials = known.events.copy(), known.trials.copy()
    events[index[old]] += some.events[old]
    trials[index[old]] += some.trials[old]
    if old.all():
        return _Some(known.hashes, known.X, events, trials, known.first)
    new = ~old
    return _Some(
        np.concatenate([known.hashes, some.hashes[new]]),
        np.concatenate([known.X, some.X[new]]),
        np.concatenate([events, some.events[new]]),
        np.concatenate([trials, some.trials[new]]),
        np.concatenate([known.first, some.first[new]]),
    )
