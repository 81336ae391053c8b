"""Where the rows and blocks of a delimited text lie in its file, so that any block can be read alone."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.records.delimited import SOMETHING, told_of_delimiter
from oddsmodel.records.delimiter import HEAD, detect_delimiter
from oddsmodel.records.faults import fault
from oddsmodel.records.header import header_end, header_names
from oddsmodel.records.stream.text_bytes import PART, TextBytes, look_through
from oddsmodel.records.text_rows import blank_lines, row_ends, text_of_rows
from oddsmodel.records.unreadable import LONGEST_FIELD
from oddsmodel.wording import finding

LONGEST_ROW = 1 << 25
"""Bytes beyond which a row is taken for one whose quotation mark is not closed."""


@dataclass(frozen=True)
class TextLayout:
    """The layout of a delimited text.

    start: where its row of names (header, in UTF-8) starts in the file. starts: of each block (b,), and where the last
    ends (b + 1,); rows: of each block (b,). long: blocks with a row that may have too long a field. open_quote: whether
    an odd number of quotation marks is met, and a row with line breaks in it. unfinished: whether a row has no end.
    """

    text: TextBytes
    start: int
    header: bytes
    delimiter: str
    names: tuple[str, ...]
    starts: tuple[int, ...]
    rows: tuple[int, ...]
    long: tuple[int, ...]
    open_quote: bool
    unfinished: bool
    findings: tuple[Finding, ...]

    def content(self, block: int) -> bytes:
        """The row of names and the rows of a block, in UTF-8."""
        with self.text.path.open("rb") as file:
            file.seek(self.starts[block])
            return self.header + self.text.utf8(file.read(self.starts[block + 1] - self.starts[block]))


def lay_out(path: Path, source: str, *, block_rows: int, block_bytes: int) -> TextLayout:
    """The layout of a file, in blocks of so many rows, or of fewer where they have more bytes.

    Raises: InputFault for what `records.delimited.read_delimited` refuses before it parses.
    """
    text = look_through(path, source)
    start = _start_of_names(text, source)
    with path.open("rb") as file:
        file.seek(start)
        raw = file.read(PART)
        head = _as_utf8(text, raw[: (HEAD + 8) * text.unit])[: HEAD + 1]
        delimiter = detect_delimiter(head)
        if delimiter is None:
            raise InputFault(fault("one-column", f"{source}, row 1"))
        end = header_end(_narrow(text, raw)) * text.unit
        header = _as_utf8(text, raw[:end])
        names = header_names(header, delimiter, source)
        if not header.endswith((b"\n", b"\r")):
            raise InputFault(fault("no-rows", source))
        file.seek(start + end)
        rows = _Rows(start + end, text.unit, block_rows, block_bytes)
        carried = b""
        while not rows.unfinished:
            part = file.read(PART)
            data = carried + part
            narrow = _narrow(text, data)
            ends, broken = row_ends(narrow, ord(delimiter), final=not part)
            rows.add(narrow, ends, len(part) // text.unit)
            rows.broken = rows.broken or broken
            carried = data[int(ends[-1]) * text.unit :] if len(ends) else data
            rows.unfinished = len(carried) > LONGEST_ROW
            if not part:
                break
    if not rows.something:
        raise InputFault(fault("no-rows", source))
    rows.close()
    blank = (finding("note", "blank-lines"),) if rows.blank_lines else ()
    return TextLayout(
        text,
        start,
        header,
        delimiter,
        tuple(names),
        (*rows.starts, rows.end),
        tuple(rows.rows),
        tuple(rows.long),
        rows.quotes % 2 == 1 and rows.broken,
        rows.unfinished,
        (*text.findings, *told_of_delimiter(delimiter, source), *blank),
    )


def _start_of_names(text: TextBytes, source: str) -> int:
    """Where the first line with anything in it starts. Raises: InputFault for a file with nothing in it."""
    position, start = text.start, None
    with text.path.open("rb") as file:
        file.seek(position)
        while part := file.read(PART):
            narrow = _narrow(text, part)
            if start is None and (rest := narrow.lstrip(b"\r\n")):
                start = position + (len(narrow) - len(rest)) * text.unit
            if SOMETHING.search(narrow) is not None and start is not None:
                return start
            position += len(part)
    raise InputFault(fault("file-empty", source))


def _narrow(text: TextBytes, data: bytes) -> bytes:
    """A byte for each least character: those that tell rows and fields apart are kept, of any others one that is none
    of them."""
    if text.unit == 1:
        return data
    characters = np.frombuffer(data, dtype="<u2" if text.encoding == "utf-16-le" else ">u2")
    return bytes(np.minimum(characters, 255).astype(np.uint8))


def _as_utf8(text: TextBytes, data: bytes) -> bytes:
    """UTF-8 of bytes that may end within a character."""
    return data if text.encoding == "utf-8" else data.decode(text.encoding, errors="ignore").encode("utf-8")


@dataclass
class _Rows:
    """Gathers the ends of rows into blocks. end: position in the file after the last row so far."""

    end: int
    unit: int
    block_rows: int
    block_bytes: int
    starts: list[int] = field(default_factory=list)
    rows: list[int] = field(default_factory=list)
    long: list[int] = field(default_factory=list)
    quotes: int = 0
    broken: bool = False
    something: bool = False
    blank_lines: bool = False
    unfinished: bool = False
    _filled: int = 0
    _start: int = 0
    _read: int = 0
    _blank: bool = False

    def __post_init__(self) -> None:
        self._start = self._read = self.end

    def add(self, data: bytes, ends: NDArray[np.int64], new: int) -> None:
        """Rows in data of one byte a character, of which the last `new` were not looked at before."""
        fresh = data[len(data) - new :]
        self.quotes += fresh.count(b'"')
        self.something = self.something or SOMETHING.search(fresh) is not None
        if len(ends) == 0:
            return
        lengths = text_of_rows(data, ends)
        real = lengths > 0
        self._note_blank_lines(data, ends, real)
        offsets = self._read + ends[real] * self.unit
        self._cut(offsets, lengths[real])
        self._read += int(ends[-1]) * self.unit

    def close(self) -> None:
        """The block so far is a whole one."""
        if self._filled:
            self.starts.append(self._start)
            self.rows.append(self._filled)
            self._start, self._filled = self.end, 0

    def _cut(self, offsets: NDArray[np.int64], lengths: NDArray[np.int64]) -> None:
        at = 0
        while at < len(offsets):
            wanted = min(self.block_rows - self._filled, len(offsets) - at)
            fitting = int(np.searchsorted(offsets[at : at + wanted], self._start + self.block_bytes, side="right"))
            if fitting == 0 and self._filled:
                self.close()
                continue
            taken = min(wanted, max(fitting, 1))
            if lengths[at : at + taken].max() > LONGEST_FIELD and len(self.rows) not in self.long:
                self.long.append(len(self.rows))
            self._filled += taken
            at += taken
            self.end = int(offsets[at - 1])
            if self._filled == self.block_rows or taken < wanted:
                self.close()

    def _note_blank_lines(self, data: bytes, ends: NDArray[np.int64], real: NDArray[np.bool_]) -> None:
        """Blank lines before another row are worth a note."""
        if real.all() and not self._blank:
            return
        blank = blank_lines(data, ends)
        last = int(np.flatnonzero(real)[-1]) if real.any() else -1
        self.blank_lines = self.blank_lines or bool(blank[: last + 1].any()) or (self._blank and last >= 0)
        self._blank = bool(blank[last + 1 :].any()) or (self._blank and last < 0)
