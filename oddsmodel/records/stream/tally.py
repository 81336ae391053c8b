"""What is met in a column, told a part at a time: different values with the rows that hold each."""

from __future__ import annotations

from typing import Protocol

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from oddsmodel.records.arrow import as_numbers, as_texts, different_values
from oddsmodel.records.rows import Positions, Weights, occurrences
from oddsmodel.records.same_value import LONGEST_NUMBER, PLAIN_NUMBER, same_value_key

MOST_NUMBERS = 65_536
"""Different numbers beyond which only the lowest and the highest are kept, where no more are asked for."""
EDGE = 64
SMALL_RANGE = 65_536
SMALL = 65_536
WHOLE_BOUND = 2**53
BYTES_OF_A_TEXT = 200
"""What a text takes beside its letters while different ones are sought, and when a column is settled."""


class Tally(Protocol):
    """rows: how many there are; missing: how many of them are empty; size: bytes that the tally takes."""

    @property
    def rows(self) -> int: ...

    @property
    def missing(self) -> int: ...

    @property
    def size(self) -> int: ...

    def add(self, column: pa.ChunkedArray) -> None:
        """Count the cells of a part of the column."""

    def add_missing(self, rows: int) -> None:
        """Count empty cells."""


class RowTally:
    """How many rows there are, and nothing of what they hold."""

    size = 0

    def __init__(self, rows: int = 0, missing: int = 0) -> None:
        self.rows, self.missing = rows, missing

    def add(self, column: pa.ChunkedArray) -> None:
        self.rows += len(column)
        self.missing += column.null_count

    def add_missing(self, rows: int) -> None:
        self.rows, self.missing = self.rows + rows, self.missing + rows


class TextTally:
    """The different texts (or dates, or true and false) of a column, in the order in which they are met.

    by_dictionary: the column comes with a dictionary of its own, whose order is kept.
    """

    def __init__(self, *, by_dictionary: bool = False) -> None:
        self.rows = self.missing = 0
        self._by_dictionary = by_dictionary
        self._values: pa.Array | None = None
        self._counts = np.empty(0, np.int64)
        self._pending: list[tuple[pa.Array, Weights]] = []
        self._waiting = self._size = 0
        self._last: tuple[pa.Array, Positions] | None = None

    def add(self, column: pa.ChunkedArray) -> None:
        dictionary, codes = different_values(column)
        self.add_counted(dictionary, occurrences(codes, len(dictionary)), len(codes), codes)

    def add_counted(self, dictionary: pa.Array, counts: Weights, rows: int, codes: Positions) -> None:
        """Count rows whose different values (k,) are counted already; codes (rows,): the position of each, -1 none."""
        self.rows += rows
        self.missing += rows - int(counts.sum())
        if self._last is not None and len(self._last[0]) == len(dictionary) and self._last[0].equals(dictionary):
            self._counts[self._last[1]] += counts
            return
        order = np.arange(len(dictionary)) if self._by_dictionary else _as_met(codes, counts)
        self._pending.append((dictionary.take(pa.array(order)), counts[order]))
        self._waiting += len(order)
        self._size += self._pending[-1][0].nbytes + BYTES_OF_A_TEXT * len(order)
        self._last = None
        known = 0 if self._values is None else len(self._values)
        if known + self._waiting <= SMALL or self._waiting >= known:
            self._merge()
        if self._values is not None and not self._pending and len(self._values) <= SMALL:
            at = pc.index_in(dictionary, self._values)
            self._last = None if at.null_count else (dictionary, at.to_numpy())

    def add_missing(self, rows: int) -> None:
        self.rows, self.missing = self.rows + rows, self.missing + rows

    @property
    def size(self) -> int:
        return self._size

    def different(self) -> tuple[pa.Array, Weights]:
        """The different values (k,) and the rows that hold each; of an own dictionary also those that none holds."""
        self._merge()
        return self._values if self._values is not None else pa.array([], pa.string()), self._counts

    def _merge(self) -> None:
        if not self._pending:
            return
        parts = [part for part, _ in self._pending]
        counts = [part for _, part in self._pending]
        if self._values is not None:
            parts, counts = [self._values, *parts], [self._counts, *counts]
        encoded = pa.concat_arrays(parts).dictionary_encode()
        self._values = encoded.dictionary
        codes = encoded.indices.to_numpy().astype(np.intp)
        self._counts = occurrences(codes, len(self._values), np.concatenate(counts))
        self._pending, self._waiting = [], 0
        self._size = self._values.nbytes + BYTES_OF_A_TEXT * len(self._values)


def _as_met(codes: Positions, counts: Weights) -> Positions:
    """The codes that are met, in the order of their first row."""
    first = np.full(len(counts) + 1, len(codes), dtype=np.intp)
    first[codes[::-1]] = np.arange(len(codes) - 1, -1, -1)
    order = np.argsort(first[:-1])
    return order[counts[order] > 0]


class NumberTally:
    """The different numbers of a column with their rows; beyond `MOST_NUMBERS` the lowest and the highest alone.

    keep_all: keep all of them, however many. different: how many are met at least, where they are no longer all kept.
    whole: whether all are whole numbers; lowest, highest: NaN without any.
    """

    def __init__(self, *, keep_all: bool = False) -> None:
        self.rows = self.missing = 0
        self.whole = True
        self.lowest = self.highest = np.nan
        self.different: int | None = None
        self._keep_all, self._most = keep_all, MOST_NUMBERS
        self._values, self._counts = np.empty(0), np.empty(0, np.int64)
        self._pending: list[tuple[NDArray[np.float64], Weights]] = []
        self._waiting = 0

    def add(self, column: pa.ChunkedArray) -> None:
        self.add_numbers(as_numbers(column))

    def add_numbers(self, numbers: NDArray[np.float64]) -> None:
        """Count numbers (n,), NaN for an empty cell."""
        missing = np.isnan(numbers)
        self.rows += len(numbers)
        if missing.any():
            self.missing += int(missing.sum())
            numbers = numbers[~missing]
        if len(numbers):
            self._note_range(numbers)
            if self.different is not None:
                numbers = numbers[(numbers <= self._values[EDGE - 1]) | (numbers >= self._values[EDGE])]
            self._add_met(*_met(numbers))

    def add_counted(self, numbers: NDArray[np.float64], counts: Weights) -> None:
        """Count rows whose different numbers (k,) are counted already."""
        self.rows += int(counts.sum())
        if len(numbers):
            self._note_range(numbers)
            values, at = np.unique(numbers, return_inverse=True)
            self._add_met(values, occurrences(at, len(values), counts))

    def add_missing(self, rows: int) -> None:
        self.rows, self.missing = self.rows + rows, self.missing + rows

    @property
    def size(self) -> int:
        return 16 * (len(self._values) + self._waiting)

    def shorten(self) -> bool:
        """Keep the lowest and the highest numbers alone; whether that is allowed, and leaves fewer."""
        if self._keep_all or len(self._values) + self._waiting <= 2 * EDGE:
            return False
        self._most = 0
        self._merge()
        return True

    def all(self) -> tuple[NDArray[np.float64], Weights]:
        """The different numbers (k,) that are kept, in order, and the rows that hold each."""
        self._merge()
        return self._values, self._counts

    def _note_range(self, numbers: NDArray[np.float64]) -> None:
        self.whole = self.whole and bool(np.all(numbers == np.trunc(numbers)))
        self.lowest = float(np.fmin(self.lowest, numbers.min()))
        self.highest = float(np.fmax(self.highest, numbers.max()))

    def _add_met(self, values: NDArray[np.float64], counts: Weights) -> None:
        """Take in numbers (k,) in order."""
        at = np.searchsorted(self._values, values)
        if not self._pending and at.size and at[-1] < len(self._values) and np.array_equal(self._values[at], values):
            self._counts[at] += counts
            return
        self._pending.append((values, counts))
        self._waiting += len(values)
        if len(self._values) + self._waiting <= SMALL or self._waiting >= len(self._values):
            self._merge()

    def _merge(self) -> None:
        if self._pending:
            values, at = np.unique(
                np.concatenate([self._values, *(part for part, _ in self._pending)]), return_inverse=True
            )
            counts = np.concatenate([self._counts, *(part for _, part in self._pending)])
            self._values, self._counts = values, occurrences(at, len(values), counts)
            self._pending, self._waiting = [], 0
        if self._keep_all or (self.different is None and len(self._values) <= max(self._most, 2 * EDGE)):
            return
        if self.different is None:
            self.different = len(self._values)
        self._values = np.concatenate([self._values[:EDGE], self._values[-EDGE:]])
        self._counts = np.concatenate([self._counts[:EDGE], self._counts[-EDGE:]])


def _met(numbers: NDArray[np.float64]) -> tuple[NDArray[np.float64], Weights]:
    """The different numbers in order, and how often each is met."""
    if len(numbers) == 0:
        return numbers, np.empty(0, np.int64)
    least, most = float(numbers.min()), float(numbers.max())
    if most - least <= SMALL_RANGE and np.all(numbers == np.trunc(numbers)):
        counts = np.bincount((numbers - least).astype(np.int64))
        at = np.flatnonzero(counts)
        return (at + least).astype(np.float64), counts[at].astype(np.int64)
    values, counts = np.unique(numbers, return_counts=True)
    return values, counts.astype(np.int64)


class WrittenNumberTally:
    """A column of texts that the plan says is one of numbers: its plainly written numbers, and its other texts."""

    def __init__(self) -> None:
        self.numbers = NumberTally()
        self.texts = TextTally()

    @property
    def rows(self) -> int:
        return self.numbers.rows + self.texts.rows

    @property
    def missing(self) -> int:
        return self.texts.missing

    @property
    def size(self) -> int:
        return self.numbers.size + self.texts.size

    def add(self, column: pa.ChunkedArray) -> None:
        dictionary, codes = different_values(column)
        counts = occurrences(codes, len(dictionary))
        parsed = plainly_written(dictionary)
        plain = ~np.isnan(parsed)
        self.numbers.add_counted(parsed[plain & (counts > 0)], counts[plain & (counts > 0)])
        others = codes[np.append(~plain, True)[codes]]
        self.texts.add_counted(dictionary, np.where(plain, 0, counts), len(others), others)

    def add_missing(self, rows: int) -> None:
        self.texts.add_missing(rows)

    def different(self) -> tuple[pa.Array, Weights]:
        """The different texts (k,), of numbers one spelling each and only those that are kept, and the rows of each."""
        texts, counts = self.texts.different()
        numbers, of_numbers = self.numbers.all()
        return pa.concat_arrays([texts.cast(pa.string()), _spelt(numbers)]), np.concatenate([counts, of_numbers])


def one_spelling(texts: pa.Array) -> pa.Array:
    """The texts, plainly written numbers as `WrittenNumberTally` spells them."""
    numbers = plainly_written(texts)
    plain = ~np.isnan(numbers)
    return pc.replace_with_mask(as_texts(texts, days_only=False), pa.array(plain), _spelt(numbers[plain]))


def _spelt(numbers: NDArray[np.float64]) -> pa.Array:
    return pa.array([same_value_key(float(number)) for number in numbers], pa.string())


def plainly_written(texts: pa.Array) -> NDArray[np.float64]:
    """The numbers (k,) that texts are in plain spelling, below 2^53; NaN for any other text."""
    texts = as_texts(texts, days_only=False)
    written = pc.match_substring_regex(texts, f"^(?:{PLAIN_NUMBER.pattern})$")
    plain = np.asarray(written.to_numpy(zero_copy_only=False), dtype=np.bool_)
    plain &= pc.binary_length(texts).to_numpy(zero_copy_only=False) <= LONGEST_NUMBER
    parsed = np.full(len(texts), np.nan)
    unsigned = pc.replace_substring_regex(texts.filter(pa.array(plain)), r"^\+", "")
    parsed[plain] = unsigned.cast(pa.float64()).to_numpy(zero_copy_only=False)
    parsed[np.abs(parsed) >= WHOLE_BOUND] = np.nan
    return parsed
