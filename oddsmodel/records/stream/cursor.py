"""Blocks that are asked for one by one, in about their order and by several threads, each decoded once."""

from __future__ import annotations

import threading
from collections.abc import Iterator, Sequence

import pyarrow as pa

from oddsmodel.records.stream.source import Source

AHEAD = 4
"""Blocks that are kept until they are asked for, when a later one comes first."""


class Cursor:
    """Reads on from the last block that was asked for, or from the row group of one that lies farther away."""

    def __init__(self, source: Source, columns: Sequence[str]) -> None:
        self._source, self._columns = source, tuple(columns)
        self._lock = threading.Lock()
        self._tables: Iterator[pa.Table] | None = None
        self._next = 0
        self._kept: dict[int, pa.Table] = {}

    def table(self, number: int) -> pa.Table:
        """One block. Raises: InputFault as `Source.tables` does."""
        if self._source.any_order:
            return next(self._source.tables(self._columns, number, number + 1))
        with self._lock:
            if number in self._kept:
                return self._kept.pop(number)
            tables = self._tables
            if tables is None or not self._next <= number < self._next + AHEAD:
                tables, self._next = self._source.tables(self._columns, number), number
            self._tables = None  # a failed read leaves nothing to go on from
            self._kept = {at: table for at, table in self._kept.items() if at > number - AHEAD}
            for at in range(self._next, number):
                self._kept[at] = next(tables)
            table = next(tables)
            self._tables, self._next = tables, number + 1
            return table
