"""Why the rows of a text table cannot be told apart: the second look, taken only when the first has failed."""

from __future__ import annotations

import contextlib
from collections.abc import Sequence

import numpy as np
import pyarrow as pa
import pyarrow.csv as pa_csv
from numpy.typing import NDArray

from oddsmodel.errors import Fault
from oddsmodel.records.faults import fault

LONGEST_FIELD = 1_000_000
ROWS_NAMED = 5


def why_unreadable(content: bytes, delimiter: str, names: Sequence[str], source: str) -> list[Fault]:
    """The faults of a table that pyarrow refused: uneven rows with their rows and widths, or what else it can be."""
    uneven: list[tuple[int, int]] = []
    total = 0

    def note(row: pa_csv.InvalidRow) -> str:
        nonlocal total
        total += 1
        if len(uneven) < ROWS_NAMED:
            uneven.append((row.number or 0, row.actual_columns))
        return "skip"

    with contextlib.suppress(pa.ArrowInvalid):
        pa_csv.read_csv(
            pa.BufferReader(content),
            pa_csv.ReadOptions(column_names=list(names), skip_rows=1, use_threads=False, block_size=1 << 22),
            pa_csv.ParseOptions(delimiter=delimiter, newlines_in_values=b'"' in content, invalid_row_handler=note),
            pa_csv.ConvertOptions(column_types={name: pa.string() for name in names}),
        )
    too_long = _long_line(content, source)
    if too_long:
        return too_long
    found: list[Fault] = []
    if uneven:
        rows = [row for row, _ in uneven]
        widths = [width for _, width in uneven]
        found.append(fault("rows-uneven", source, expected=len(names), rows=rows, widths=widths, total=total))
    if content.count(b'"') % 2 == 1:
        found.append(fault("quote-not-closed", f"{source}, row {first_odd_line(content)}"))
    return found or [fault("rows-not-readable", source)]


def _line_ends(content: bytes) -> NDArray[np.int64]:
    """Positions of the line ends, with one before the first line and one after the last."""
    characters = np.frombuffer(content, dtype=np.uint8)
    ends = np.flatnonzero(characters == 10)
    if len(ends) == 0:
        ends = np.flatnonzero(characters == 13)
    return np.concatenate([[-1], ends, [len(content)]])


def _long_line(content: bytes, source: str) -> list[Fault]:
    """A fault for the first line longer than a field may be, if there is one."""
    lengths = np.diff(_line_ends(content))
    if lengths.max() <= LONGEST_FIELD:
        return []
    row = int(np.argmax(lengths > LONGEST_FIELD)) + 1
    return [fault("field-too-long", f"{source}, row {row}", bytes=int(lengths[row - 1]))]


def first_odd_line(content: bytes) -> int:
    """Number of the first line with an odd number of quotation marks."""
    quotes = np.flatnonzero(np.frombuffer(content, dtype=np.uint8) == 34)
    within = np.diff(np.searchsorted(quotes, _line_ends(content)))
    return int(np.argmax(within % 2 == 1)) + 1
