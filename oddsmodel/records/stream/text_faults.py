"""Why the rows of a delimited text in blocks cannot be told apart: looked for only when they cannot."""

from __future__ import annotations

import contextlib
from collections.abc import Iterator

import numpy as np
import pyarrow as pa
import pyarrow.csv as pa_csv
from numpy.typing import NDArray

from oddsmodel.errors import Fault
from oddsmodel.records.delimited import BLOCK
from oddsmodel.records.faults import fault
from oddsmodel.records.stream.text_layout import TextLayout
from oddsmodel.records.unreadable import LONGEST_FIELD, ROWS_NAMED


def why_unreadable(layout: TextLayout, source: str) -> list[Fault]:
    """The faults that `records.unreadable.why_unreadable` tells of a whole text."""
    too_long = _long_line(layout, source)
    if too_long:
        return too_long
    uneven: list[tuple[int, int]] = []
    total = before = 0

    def note(row: pa_csv.InvalidRow) -> str:
        nonlocal total
        total += 1
        if len(uneven) < ROWS_NAMED:
            uneven.append((before + (row.number or 0), row.actual_columns))
        return "skip"

    for block, rows in enumerate(layout.rows):
        content = layout.content(block)
        with contextlib.suppress(pa.ArrowInvalid):
            pa_csv.read_csv(
                pa.BufferReader(content),
                pa_csv.ReadOptions(column_names=list(layout.names), skip_rows=1, use_threads=False, block_size=BLOCK),
                pa_csv.ParseOptions(
                    delimiter=layout.delimiter, newlines_in_values=b'"' in content, invalid_row_handler=note
                ),
                pa_csv.ConvertOptions(column_types={name: pa.string() for name in layout.names}),
            )
        before += rows
    found: list[Fault] = []
    if uneven:
        rows_named, widths = [row for row, _ in uneven], [width for _, width in uneven]
        facts = {"expected": len(layout.names), "rows": rows_named, "widths": widths, "total": total}
        found.append(fault("rows-uneven", source, **facts))
    odd = first_odd_line(layout)
    if odd is not None:
        found.append(fault("quote-not-closed", f"{source}, row {odd}"))
    return found or [fault("rows-not-readable", source)]


def first_odd_line(layout: TextLayout) -> int | None:
    """Number of the first line with an odd number of quotation marks; None where their number is even in all."""
    number, quotes = 1, 0
    odd_at: int | None = None
    for lines, counts, _ in _lines(layout):
        odd = np.flatnonzero(counts % 2 == 1)
        if odd_at is None and len(odd):
            odd_at = number + int(odd[0])
        quotes += int(counts.sum())
        number += lines
    return odd_at if quotes % 2 else None


def _long_line(layout: TextLayout, source: str) -> list[Fault]:
    """A fault for the first line longer than a field may be, if there is one."""
    number = 1
    for lines, _, lengths in _lines(layout):
        if lengths.size and lengths.max() > LONGEST_FIELD:
            at = int(np.argmax(lengths > LONGEST_FIELD))
            return [fault("field-too-long", f"{source}, row {number + at}", bytes=int(lengths[at]))]
        number += lines
    return []


def _lines(layout: TextLayout) -> Iterator[tuple[int, NDArray[np.int64], NDArray[np.int64]]]:
    """Part by part, how many lines end there, the quotation marks of each and its bytes with the line end."""
    carried_quotes = carried_bytes = 0
    end = b"\r" if _returns_only(layout) else b"\n"
    for part in layout.text.parts(layout.start):
        characters = np.frombuffer(part, dtype=np.uint8)
        ends = np.flatnonzero(characters == end[0])
        quotes = np.flatnonzero(characters == 34)
        upto = np.searchsorted(quotes, ends)
        counts = np.diff(np.concatenate([[0], upto]))
        lengths = np.diff(np.concatenate([[-1], ends]))
        if len(ends) == 0:
            carried_quotes, carried_bytes = carried_quotes + len(quotes), carried_bytes + len(part)
            continue
        counts[0] += carried_quotes
        lengths[0] += carried_bytes
        yield len(ends), counts, lengths
        carried_quotes, carried_bytes = len(quotes) - int(upto[-1]), len(part) - int(ends[-1]) - 1
    yield 1, np.asarray([carried_quotes]), np.asarray([carried_bytes + 1])


def _returns_only(layout: TextLayout) -> bool:
    return not any(b"\n" in part for part in layout.text.parts(layout.start))
