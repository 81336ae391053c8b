"""Whether the records fit into the memory that a run may use."""

from __future__ import annotations

import os
from pathlib import Path

from oddsmodel.plan.schema import StudyPlan
from oddsmodel.plan.size import bytes_of
from oddsmodel.records.parquet import parquet_files

PROGRAM = 250 * 10**6
"""Bytes of the program itself."""

A_NUMBER = 8
HELD_TIMES = 4
"""A record column is held about so often at the peak: as read, as coded, among the analysed, in the matrix."""

COLUMNS_A_COLUMN = 2
"""Columns of the matrix for each record column, about."""

FIRST_BYTES = 1 << 20
SHARE = 0.5
"""Of the machine's memory, where the plan does not say how much a run may use."""

TEXT_TIMES = 1.5
"""A file of text is in memory while it is read, with what is parsed of it."""

PARQUET = b"PAR1"
TEXT_ENDINGS = (".csv", ".tsv", ".tab", ".txt")


def allowed(plan: StudyPlan) -> int:
    """Bytes that a run may use: the plan's, or half of the machine's memory."""
    stated = None if plan.run.memory is None else bytes_of(plan.run.memory)
    if stated is not None:
        return stated
    return int(SHARE * os.sysconf("SC_PHYS_PAGES") * os.sysconf("SC_PAGE_SIZE"))


def wanted(path: Path) -> int | None:
    """Bytes that a run on this file would use at its peak with all records in memory, roughly.

    None where a file of this kind is always read whole (a spreadsheet), or cannot be read.
    """
    try:
        if path.is_dir():
            return PROGRAM + sum(_of_parquet(file) for file in parquet_files(path))
        with path.open("rb") as file:
            start = file.read(FIRST_BYTES)
        if start.startswith(PARQUET):
            return PROGRAM + _of_parquet(path)
        size = path.stat().st_size
    except (OSError, ValueError):
        return None
    if not path.name.lower().endswith(TEXT_ENDINGS):
        return None
    lines = max(1, start.count(b"\n"))
    columns = max(start.split(b"\n", 1)[0].count(mark) for mark in (b",", b";", b"\t", b"|")) + 1
    rows = int(size / len(start) * lines) if start else 0
    return PROGRAM + int(TEXT_TIMES * size) + _of_table(rows, columns)


def _of_table(rows: int, columns: int) -> int:
    return rows * columns * A_NUMBER * (HELD_TIMES + COLUMNS_A_COLUMN)


def _of_parquet(path: Path) -> int:
    import pyarrow.parquet as pq

    found = pq.read_metadata(path)
    return _of_table(found.num_rows, found.num_columns)
