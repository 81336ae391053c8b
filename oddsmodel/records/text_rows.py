"""Where the rows of delimited text end, with line breaks within quotation marks passed over as the parser does."""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

LINE_FEED, RETURN, QUOTE = 10, 13, 34
QUOTED = re.compile(rb'"(?:[^"]++|"")*+"')
Ends = NDArray[np.int64]


def row_ends(data: bytes, delimiter: int, *, final: bool) -> tuple[Ends, bool]:
    """Positions after the line end of each row in bytes that start with a row, and whether a row has line breaks.

    A row whose line end is not there is none, but for the last one of the file (`final`). A line without anything in it
    is a row here.
    """
    characters = np.frombuffer(data, dtype=np.uint8)
    lines = _line_ends(data, characters, final)
    quotes = np.flatnonzero(characters == QUOTE)
    if len(quotes) == 0:
        return lines, False
    if _well_formed(characters, quotes, delimiter):
        within = np.searchsorted(quotes, lines) % 2 == 1
        broken = bool(within[:-1].any() or (within[-1:].any() and _is_broken(data)))
        within[-1:] &= not final
        return lines[~within], broken
    return _one_by_one(data, lines, quotes, delimiter, final)


def text_of_rows(data: bytes, ends: Ends) -> Ends:
    """How many bytes each row has without its line end."""
    characters = np.frombuffer(data, dtype=np.uint8)
    starts = np.concatenate([[0], ends[:-1]])
    last = np.where(ends > starts, characters[ends - 1], 0)
    before = np.where(ends > starts + 1, characters[ends - 2], 0)
    closing = (last == LINE_FEED).astype(np.int64) + ((last == LINE_FEED) & (before == RETURN)) + (last == RETURN)
    lengths: Ends = ends - starts - closing
    return lengths


def blank_lines(data: bytes, ends: Ends) -> NDArray[np.bool_]:
    """Which rows have nothing but a line feed at their end."""
    characters = np.frombuffer(data, dtype=np.uint8)
    blank: NDArray[np.bool_] = (text_of_rows(data, ends) == 0) & (characters[ends - 1] == LINE_FEED)
    return blank


def _line_ends(data: bytes, characters: NDArray[np.uint8], final: bool) -> Ends:
    """Positions after each line end: a line feed with or without a return before it, or a return alone."""
    ends = np.flatnonzero(characters == LINE_FEED) + 1
    if b"\r" in data:
        returns = np.flatnonzero(characters == RETURN) + 1
        inner = returns[returns < len(characters)]
        alone = inner[characters[inner] != LINE_FEED]
        ends = np.union1d(ends, np.append(alone, returns[len(inner) :]) if final else alone)
    if final and len(data) and (len(ends) == 0 or ends[-1] < len(data)):
        ends = np.append(ends, len(data))
    return ends.astype(np.int64)


def _well_formed(characters: NDArray[np.uint8], quotes: Ends, delimiter: int) -> bool:
    """Whether every quotation mark that opens stands at the start of a field or doubles the one before it.

    The marks open and close in turn then, as they do for the parser.
    """
    opening = quotes[0::2]
    before = np.where(opening > 0, characters[opening - 1], LINE_FEED)
    starts = (before == delimiter) | (before == LINE_FEED) | (before == RETURN)
    doubled = np.zeros(len(opening), dtype=np.bool_)
    doubled[1:] = quotes[1::2][: len(opening) - 1] == opening[1:] - 1
    return bool(np.all(starts | doubled))


def _one_by_one(data: bytes, lines: Ends, quotes: Ends, delimiter: int, final: bool) -> tuple[Ends, bool]:
    """As `row_ends`, for misplaced quotation marks: the lines that have some are read field by field."""
    unquoted = re.compile(b"[^" + re.escape(bytes([delimiter])) + rb"\r\n]*+")
    starts = np.concatenate([[0], lines])
    kept: list[Ends] = []
    done, broken = 0, False
    for line in np.unique(np.searchsorted(lines, quotes, side="right")):
        if line < done or line >= len(lines):
            continue
        kept.append(lines[done:line])
        end = _end_of_row(data, int(starts[line]), unquoted, delimiter)
        last = len(lines) if end is None else int(np.searchsorted(lines, end, side="right"))
        if last == len(lines):
            kept.append(lines[-1:] if final else lines[:0])
            broken = broken or bool(line < len(lines) - 1) or (end is None and _is_broken(data))
            return np.concatenate(kept), broken
        kept.append(lines[last : last + 1])
        broken, done = broken or bool(last > line), last + 1
    kept.append(lines[done:])
    return np.concatenate(kept), broken


def _is_broken(data: bytes) -> bool:
    return data.endswith((b"\n", b"\r"))


def _end_of_row(data: bytes, start: int, unquoted: re.Pattern[bytes], delimiter: int) -> int | None:
    """Where a row ends, before its line end; None where a quotation mark is not closed."""
    at = start
    while True:
        if data[at : at + 1] == b'"':
            quoted = QUOTED.match(data, at)
            if quoted is None:
                return None
            at = quoted.end()
        found = unquoted.match(data, at)
        at = at if found is None else found.end()
        if at >= len(data) or data[at] != delimiter:
            return at
        at += 1
