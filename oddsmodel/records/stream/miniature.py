"""A column in small: its different values, each with the rows that hold it, on which the column is settled."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from oddsmodel.records.arrow import (
    RAW_TYPES,
    as_numbers,
    as_texts,
    different_values,
    has_midnights_only,
    plain_values,
    what_it_holds,
)
from oddsmodel.records.raw import RawColumn, RawType
from oddsmodel.records.rows import ROWS_NAMED, Positions, Weights
from oddsmodel.records.stream.identity import IdentityTally
from oddsmodel.records.stream.source import Source
from oddsmodel.records.stream.tally import NumberTally, Tally, TextTally, WrittenNumberTally, one_spelling
from oddsmodel.records.texts import text_column


@dataclass(frozen=True)
class Miniature:
    """One column of a source in small.

    raw: its different values (m,), each once, as `read_table` has them for every row. rows: behind each of them.
    different: how many numbers are met at least, where only the lowest and the highest are kept. days_only: whether all
    its moments are midnights, of which only the day is kept. identity: of an identifier how many records have it, and
    how many different ones there are, instead of its values. incomplete: neither is known, for want of memory.
    """

    raw: RawColumn
    rows: FoundRows
    different: int | None = None
    days_only: bool = False
    identity: tuple[int, int] | None = None
    incomplete: bool = False


def miniature(source: Source, column: str, tally: Tally, kind: pa.DataType | None) -> Miniature:
    """What was tallied of a column. kind: the Arrow type of its values; None where it has none."""
    if isinstance(tally, NumberTally):
        numbers, counts = tally.all()
        values, counts = _with_missing(numbers, counts, tally.missing)
        rows = FoundRows(source, column, numbers, np.arange(len(values)), counts)
        return Miniature(RawColumn(pd.Series(values), "number"), rows, tally.different)
    if isinstance(tally, WrittenNumberTally):
        texts, counts = tally.different()
        found = _of_texts(source, column, texts, counts, tally.missing, "text", False)
        rows = replace(found.rows, numbers_in_one_spelling=True)
        return replace(found, rows=rows, different=tally.numbers.different)
    if isinstance(tally, TextTally):
        texts, counts = tally.different()
        holds = "texts" if kind is None else what_it_holds(kind)
        days_only = holds == "dates" and has_midnights_only(texts)
        raw_type = RAW_TYPES.get(holds, "text")
        found = _of_texts(source, column, texts, counts, tally.missing, raw_type, days_only)
        return replace(found, days_only=days_only)
    rows = FoundRows(source, column, np.empty(0), np.arange(1), np.asarray([tally.rows]))
    return Miniature(RawColumn(pd.Series([np.nan]), "empty"), rows, incomplete=kind is not None)


def identity_in_small(source: Source, column: str, tally: IdentityTally) -> Miniature:
    """What was tallied of an identifier; the source is read again where few of them seem to repeat."""
    different = tally.check(table[column] for table in source.tables([column]))
    nothing = pd.Series(pd.Categorical([]))
    rows = FoundRows(source, column, np.empty(0), np.empty(0, np.intp), np.empty(0, np.int64))
    raw = RawColumn(nothing, "text", tally.stripped, tally.cleaned)
    return Miniature(raw, rows, identity=(tally.records, different))


def _of_texts(
    source: Source,
    column: str,
    values: pa.Array,
    counts: Weights,
    missing: int,
    raw_type: RawType,
    days_only: bool,
) -> Miniature:
    at = np.flatnonzero(counts)
    weights = counts[at]
    codes = at
    if missing:
        codes, weights = np.append(at, -1), np.append(weights, missing)
    raw = text_column(as_texts(values, days_only=days_only), codes, raw_type, weights)
    return Miniature(raw, FoundRows(source, column, values, codes, weights))


def _with_missing(values: NDArray[np.float64], counts: Weights, missing: int) -> tuple[NDArray[np.float64], Weights]:
    if not missing:
        return values, counts
    return np.append(values, np.nan), np.append(counts, missing)


@dataclass(frozen=True)
class FoundRows:
    """The rows behind the values of a miniature, looked for in the source when they are to be named.

    values (k,): those of the source; codes (m,): which of them each value of the miniature is, out of range for an
    empty cell. numbers_in_one_spelling: plainly written numbers among the values have one spelling each.
    """

    source: Source
    column: str
    values: pa.Array | NDArray[np.float64]
    codes: Positions
    weights: Weights
    numbers_in_one_spelling: bool = False

    def total(self, at: Positions) -> int:
        return int(self.weights[at].sum())

    def first(self, at: Positions) -> tuple[list[int], Positions]:
        wanted = min(ROWS_NAMED, self.total(at))
        position = np.full(len(self.values) + 2, -1, dtype=np.intp)
        inside = np.where((self.codes >= 0) & (self.codes < len(self.values)), self.codes, len(self.values))
        position[inside[at]] = at
        rows: list[int] = []
        positions: list[int] = []
        before = self.source.first_row
        for table in self.source.tables([self.column]):
            held = position[self._codes(plain_values(table[self.column]))]
            for row in np.flatnonzero(held >= 0)[: wanted - len(rows)]:
                rows.append(before + int(row))
                positions.append(int(held[row]))
            if len(rows) == wanted:
                break
            before += table.num_rows
        return rows, np.asarray(positions, dtype=np.intp)

    def _codes(self, column: pa.ChunkedArray) -> Positions:
        """Which of the k values each cell has: k for an empty cell, k + 1 for any other value."""
        none = len(self.values)
        if isinstance(self.values, np.ndarray):
            numbers = as_numbers(column) if what_it_holds(column.type) != "nothing" else np.full(len(column), np.nan)
            at = np.searchsorted(self.values, numbers)
            same = np.append(self.values, np.nan)[at] == numbers
            return np.where(np.isnan(numbers), none, np.where(same, at, none + 1))
        dictionary, codes = different_values(column)
        sought = one_spelling(dictionary) if self.numbers_in_one_spelling else dictionary
        found = pc.index_in(sought, self.values.cast(sought.type)).fill_null(none + 1)
        return np.append(found.to_numpy().astype(np.intp), none)[codes]
