"""Which character stands between the fields of a text table, told from its first rows."""

from __future__ import annotations

import csv
import io

DELIMITERS = (",", ";", "\t", "|")
HEAD = 1 << 18
ROWS = 50


def detect_delimiter(content: bytes) -> str | None:
    """The delimiter that splits the first rows most evenly, or None when none splits the header.

    content: the table as UTF-8 bytes; only its head is looked at. Of delimiters that split equally evenly the one
    that makes most columns is taken.
    """
    head = content[:HEAD]
    if len(content) > HEAD:
        head = head[: max(head.rfind(b"\n"), head.rfind(b"\r")) + 1] or head
    text = head.decode("utf-8", errors="replace")
    best: tuple[float, int] = (0.0, 1)
    chosen = None
    for delimiter in DELIMITERS:
        widths = _widths(text, delimiter)
        if not widths or widths[0] < 2:
            continue
        evenness = sum(width == widths[0] for width in widths) / len(widths)
        if (evenness, widths[0]) > best or chosen is None:
            best, chosen = (evenness, widths[0]), delimiter
    return chosen


def _widths(text: str, delimiter: str) -> list[int]:
    """Number of fields in each of the first rows."""
    widths: list[int] = []
    try:
        for row in csv.reader(io.StringIO(text, newline=""), delimiter=delimiter):
            if row:
                widths.append(len(row))
            if len(widths) >= ROWS:
                break
    except csv.Error:  # a field longer than the reader's bound; the rows before it are enough
        return widths
    return widths
