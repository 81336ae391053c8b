"""A delimited text read in blocks of rows by their places in the file, with types told from all of its rows."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import pyarrow as pa
import pyarrow.compute as pc

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.records.arrow import beyond_whole_bound
from oddsmodel.records.decimal_comma import different_texts, has_decimal_commas, refuse_ambiguous
from oddsmodel.records.delimited import (
    TEXT,
    DelimitedText,
    has_leading_zeros,
    is_number,
    refuse_long_fields,
    starts_with_zero,
)
from oddsmodel.records.faults import fault
from oddsmodel.records.stream.source import Piece
from oddsmodel.records.stream.text_faults import first_odd_line, why_unreadable
from oddsmodel.records.stream.text_layout import TextLayout, lay_out
from oddsmodel.wording import finding


@dataclass(frozen=True)
class DelimitedSource:
    """See `Source`. types: of the columns for which they are settled; as_written: columns kept as texts by the plan;
    not_recorded: texts that do not keep a column from being one of numbers."""

    path: Path
    layout: TextLayout
    block_rows: int
    not_recorded: tuple[str, ...]
    as_written: frozenset[str]
    types: Mapping[str, pa.DataType]
    decimal_point: str = "."
    first_row: int = 2
    reads_numbers_from_texts = True
    any_order = True

    @property
    def name(self) -> str:
        return self.path.name

    @property
    def names(self) -> tuple[str, ...]:
        return self.layout.names

    @property
    def refused(self) -> Mapping[str, str]:
        return {}

    @property
    def findings(self) -> tuple[Finding, ...]:
        comma = (finding("note", "decimal-comma"),) if self.decimal_point == "," else ()
        converted = self.layout.text.findings
        others = self.layout.findings[len(converted) :]
        delimiter = tuple(one for one in others if one.code == "delimiter")
        return (*converted, *delimiter, *comma, *(one for one in others if one.code != "delimiter"))

    @property
    def rows(self) -> int:
        return sum(self.layout.rows)

    @property
    def blocks(self) -> int:
        return len(self.layout.rows)

    def sha256(self) -> str:
        return self.layout.text.sha256

    def has_own_dictionary(self, column: str) -> bool:
        return False

    def keeps_as_texts(self, column: str) -> bool:
        return False

    def settled(self, types: Mapping[str, pa.DataType], as_texts: Collection[str]) -> DelimitedSource:
        return replace(self, types={**self.types, **types, **dict.fromkeys(as_texts, TEXT)})

    def reviewed(self, texts: Mapping[str, pa.Array]) -> DelimitedSource | None:
        """The same with a decimal comma, where the texts of the columns that hold some speak for it; None: it stays.

        Raises: InputFault where the decimal mark cannot be told.
        """
        if self.layout.delimiter == ",":
            return None
        columns = [
            (name, pa.chunked_array([values]).filter(pc.not_equal(values, "")))
            for name, values in texts.items()
            if name not in self.as_written
        ]
        if self.decimal_point == ".":
            return self._with_comma() if has_decimal_commas(columns, self.name) else None
        refuse_ambiguous(columns, self.name)
        return None

    def pieces(self, columns: Sequence[str]) -> Iterator[Piece]:
        types = dict(self.types)
        for block in range(self.blocks):
            text = self._text(block)
            table, refused = self._met(text, columns, types, block)
            numbers = [name for name in table.column_names if is_number(table[name].type)]
            zeros: list[str] = []
            if numbers and has_leading_zeros(text.content, text.delimiter):
                again = text.parse(text_columns=numbers, only=numbers)
                zeros = [name for name in numbers if starts_with_zero(again[name])]
            whole = [name for name in numbers if pa.types.is_integer(table[name].type)]
            words = [name for name in numbers if name not in whole and not _are_finite(table[name])]
            yield Piece(table, {*refused, *zeros, *words}, [name for name in whole if beyond_whole_bound(table[name])])
        self._refuse_what_is_broken()

    def tables(self, columns: Sequence[str], first: int = 0, end: int | None = None) -> Iterator[pa.Table]:
        types = {name: self.types[name] for name in columns}
        for block in range(first, self.blocks if end is None else end):
            try:
                table = self._text(block).parse(only=columns, types=types)
            except (pa.ArrowInvalid, UnicodeDecodeError) as error:
                raise InputFault(fault("file-changed", self.name)) from error
            if table.num_rows != self.layout.rows[block]:
                raise InputFault(fault("file-changed", self.name))
            yield table

    def _met(
        self, text: DelimitedText, columns: Sequence[str], types: dict[str, pa.DataType], block: int
    ) -> tuple[pa.Table, list[str]]:
        """A block whose types are told where they are not settled, and columns that are not of the type tried."""
        try:
            table = text.parse(only=columns, types={name: types[name] for name in columns if name in types})
            refused: list[str] = []
        except pa.ArrowInvalid as error:
            tried = [name for name in columns if types.get(name, TEXT) != TEXT]
            refused = [name for name in tried if not _parses(text, name, types[name])]
            if not refused:
                raise InputFault(why_unreadable(self.layout, self.name)) from error
            types.update(dict.fromkeys(refused, TEXT))
            table = text.parse(only=columns, types={name: types[name] for name in columns if name in types})
        if table.num_rows != self.layout.rows[block]:
            raise InputFault(fault("file-changed", self.name))
        return table, refused

    def _text(self, block: int) -> DelimitedText:
        layout = self.layout
        content = layout.content(block)
        return DelimitedText(content, layout.delimiter, layout.names, self.not_recorded, self.decimal_point)

    def _with_comma(self) -> DelimitedSource:
        return replace(self, decimal_point=",", types=dict.fromkeys(self.as_written, TEXT))

    def _guessed(self) -> DelimitedSource:
        """The same with a decimal comma where the first block speaks for it."""
        if self.layout.delimiter == "," or not self.blocks:
            return self
        apart = list(self.as_written)
        try:
            commas = has_decimal_commas(different_texts(self._text(0).parse(text_columns=apart), apart), self.name)
        except pa.ArrowInvalid as error:
            raise InputFault(why_unreadable(self.layout, self.name)) from error
        except InputFault:
            if self.blocks == 1:
                raise
            return self
        if not commas:
            return self
        source = self._with_comma()
        refuse_ambiguous(different_texts(source._text(0).parse(text_columns=apart), apart), self.name)
        return source

    def _refuse_what_is_broken(self) -> None:
        if self.layout.open_quote:
            raise InputFault(fault("quote-not-closed", f"{self.name}, row {first_odd_line(self.layout)}"))
        for block in self.layout.long:
            table = self._text(block).parse(text_columns=self.names)
            refuse_long_fields(table, self.name, self.first_row + sum(self.layout.rows[:block]))


def open_delimited(
    path: Path, *, block_rows: int, block_bytes: int, not_recorded: Sequence[str], as_written: Collection[str]
) -> DelimitedSource:
    """A delimited text. Raises: InputFault as `records.delimited.read_delimited` does for what shows at its start."""
    layout = lay_out(path, path.name, block_rows=block_rows, block_bytes=block_bytes)
    if layout.unfinished:
        raise InputFault(why_unreadable(layout, path.name))
    known = frozenset(as_written) & set(layout.names)
    source = DelimitedSource(path, layout, block_rows, tuple(not_recorded), known, dict.fromkeys(known, TEXT))
    return source._guessed()


def _parses(text: DelimitedText, name: str, kind: pa.DataType) -> bool:
    try:
        text.parse(only=[name], types={name: kind})
    except pa.ArrowInvalid:
        return False
    return True


def _are_finite(column: pa.ChunkedArray) -> bool:
    """Whether no word was met that a parser takes for a number."""
    return bool(pc.all(pc.is_finite(column), min_count=0).as_py())
