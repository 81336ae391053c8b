"""CSV and other delimited text into an Arrow table: text columns dictionary encoded, numbers where they are clean."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.csv as pa_csv

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.records.decimal_comma import different_texts, has_decimal_commas, refuse_ambiguous
from oddsmodel.records.delimiter import detect_delimiter
from oddsmodel.records.encoding import to_utf8
from oddsmodel.records.faults import fault, in_column
from oddsmodel.records.header import header_end, header_names
from oddsmodel.records.text_rows import blank_lines, row_ends, text_of_rows
from oddsmodel.records.unreadable import LONGEST_FIELD, first_odd_line, why_unreadable
from oddsmodel.wording import finding

TEXT = pa.dictionary(pa.int32(), pa.string())
SOMETHING = re.compile(rb"\S")
BLANK_LINE = re.compile(rb"\n\r?\n(?=[\r\n]*[^\r\n])")
BLOCK = 1 << 22
WINDOW = 1 << 24
WHOLE_BOUND = 2**53
DELIMITER_NAMES = {",": "comma", ";": "semicolon", "\t": "tab", "|": "vertical bar"}


@dataclass(frozen=True, slots=True)
class DelimitedText:
    """What is needed to parse a text table: its bytes in UTF-8, without blank lines at the start."""

    content: bytes
    delimiter: str
    names: tuple[str, ...]
    not_recorded: tuple[str, ...]
    decimal_point: str = "."

    def parse(
        self,
        *,
        text_columns: Collection[str] = (),
        only: Sequence[str] = (),
        types: Mapping[str, pa.DataType] | None = None,
    ) -> pa.Table:
        """The table; `text_columns` are kept as text, of the others the types are told from all their values.

        types: of columns for which they are settled.

        Raises: pyarrow.ArrowInvalid when the rows cannot be told apart.
        """
        options = pa_csv.ConvertOptions(
            column_types={**dict.fromkeys(text_columns, TEXT), **(types or {})},
            include_columns=list(only),
            null_values=sorted({"", *self.not_recorded}),
            strings_can_be_null=False,
            auto_dict_encode=True,
            auto_dict_max_cardinality=2**31 - 1,
            decimal_point=self.decimal_point,
        )
        return pa_csv.read_csv(
            pa.BufferReader(self.content),
            pa_csv.ReadOptions(column_names=list(self.names), skip_rows=1, block_size=BLOCK),
            pa_csv.ParseOptions(delimiter=self.delimiter, newlines_in_values=b'"' in self.content),
            options,
        )


def read_delimited(
    data: bytes, source: str, *, text_columns: Collection[str] = (), not_recorded: Sequence[str] = ("",)
) -> tuple[pa.Table, tuple[Finding, ...]]:
    """The table in the bytes of a CSV, TSV or like file, and notes on how it was read.

    text_columns: columns whose texts are kept as written (levels, identifiers); `not_recorded`: texts that do not
    keep a column from being one of numbers.

    Raises: InputFault for an encoding that cannot be told, NUL bytes, faulty names, no rows, rows of different
        lengths, a field over 1 MB, a quotation mark that is not closed, a decimal comma that is ambiguous.
    """
    converted, notes = to_utf8(data, source)
    content = converted.lstrip(b"\r\n") if converted[:1] in (b"\r", b"\n") else converted
    if SOMETHING.search(content) is None:
        raise InputFault(fault("file-empty", source))
    text, delimiter_notes = _layout(content, source, tuple(not_recorded))
    known = tuple(name for name in text.names if name in set(text_columns))
    table = _parsed(text, known, source)
    comma_notes: tuple[Finding, ...] = ()
    if text.delimiter != "," and has_decimal_commas(different_texts(table, known), source):
        text = replace(text, decimal_point=",")
        table = _parsed(text, known, source)
        refuse_ambiguous(different_texts(table, known), source)
        comma_notes = (finding("note", "decimal-comma"),)
    if table.num_rows == 0:
        raise InputFault(fault("no-rows", source))
    _refuse_open_quote(table, content, source)
    table = _with_numbers_as_written(table, text)
    refuse_long_fields(table, source)
    return table, notes + delimiter_notes + comma_notes + _blank_lines(content, text.delimiter)


def _layout(content: bytes, source: str, not_recorded: tuple[str, ...]) -> tuple[DelimitedText, tuple[Finding, ...]]:
    """The delimiter, the names and the rest that the parser must know."""
    delimiter = detect_delimiter(content)
    if delimiter is None:
        raise InputFault(fault("one-column", f"{source}, row 1"))
    end = header_end(content)
    names = header_names(content[:end], delimiter, source)
    if SOMETHING.search(content, end) is None:
        raise InputFault(fault("no-rows", source))
    return DelimitedText(content, delimiter, tuple(names), not_recorded), told_of_delimiter(delimiter, source)


def told_of_delimiter(delimiter: str, source: str) -> tuple[Finding, ...]:
    """A note where fields are not separated as the file's name says."""
    usual = "\t" if source.lower().endswith((".tsv", ".tab")) else ","
    return () if delimiter == usual else (finding("note", "delimiter", delimiter=DELIMITER_NAMES[delimiter]),)


def _parsed(text: DelimitedText, text_columns: Collection[str], source: str) -> pa.Table:
    try:
        return text.parse(text_columns=text_columns)
    except pa.ArrowInvalid as error:
        faults = why_unreadable(text.content, text.delimiter, text.names, source)
        raise InputFault(faults) from error


def _with_numbers_as_written(table: pa.Table, text: DelimitedText) -> pa.Table:
    """Columns again as text where reading them as numbers loses what was written.

    That is so of leading zeros ("007"), of whole numbers beyond 2^53, and of texts that a parser of numbers
    takes for one ("nan", "inf").
    """
    doubtful = [name for name in table.column_names if _is_not_finite_or_large(table[name])]
    numbers = [name for name in table.column_names if name not in doubtful and is_number(table[name].type)]
    zeros = numbers if numbers and has_leading_zeros(text.content, text.delimiter) else []
    if not doubtful and not zeros:
        return table
    again = text.parse(text_columns=[*doubtful, *zeros], only=[*doubtful, *zeros])
    mapping: Mapping[str, pa.ChunkedArray] = {
        **{name: again[name] for name in doubtful},
        **{name: again[name] for name in zeros if starts_with_zero(again[name])},
    }
    for name, column in mapping.items():
        table = table.set_column(table.column_names.index(name), name, column)
    return table


def is_number(kind: pa.DataType) -> bool:
    """Whether a type is one of numbers."""
    return bool(pa.types.is_integer(kind) or pa.types.is_floating(kind))


def _is_not_finite_or_large(column: pa.ChunkedArray) -> bool:
    if not is_number(column.type):
        return False
    if pa.types.is_floating(column.type) and not pc.all(pc.is_finite(column), min_count=0).as_py():
        return True
    bounds = pc.min_max(column).as_py()
    largest = 0 if bounds["max"] is None else max(abs(bounds["min"]), abs(bounds["max"]))
    if pa.types.is_integer(column.type):
        return largest > WHOLE_BOUND
    return largest >= WHOLE_BOUND and bool(pc.all(pc.equal(column, pc.trunc(column))).as_py())


def has_leading_zeros(content: bytes, delimiter: str) -> bool:
    """Whether any field starts with a zero before another digit, in quotation marks, after a space or a sign or not."""
    opens = np.zeros(256, dtype=bool)
    opens[[10, 13, 34, ord(delimiter)]] = True
    passed = np.zeros(256, dtype=bool)
    passed[[32, 43, 45]] = True
    for start in range(0, len(content), WINDOW):
        window = np.frombuffer(content, dtype=np.uint8, count=min(WINDOW + 3, len(content) - start), offset=start)
        zeros = np.flatnonzero(window[1:-1] == 48) + 1
        before = window[zeros - 1]
        zeros = zeros[opens[before] | (passed[before] & opens[window[np.maximum(zeros - 2, 0)]])]
        if np.any((window[zeros + 1] >= 48) & (window[zeros + 1] <= 57)):
            return True
    return False


def starts_with_zero(column: pa.ChunkedArray) -> bool:
    """Whether any text of a column has a zero before another digit."""
    for chunk in column.chunks:
        if pc.any(pc.match_substring_regex(chunk.dictionary, r"^\s*[+-]?0[0-9]")).as_py():
            return True
    return False


def _refuse_open_quote(table: pa.Table, content: bytes, source: str) -> None:
    """Refuse a quotation mark that is not closed and has taken further rows into its field."""
    if content.count(b'"') % 2 == 0:
        return
    for name in table.column_names:
        if not pa.types.is_dictionary(table[name].type):
            continue
        for chunk in table[name].chunks:
            if pc.any(pc.match_substring_regex(chunk.dictionary, r"[\r\n]")).as_py():
                raise InputFault(fault("quote-not-closed", f"{source}, row {first_odd_line(content)}"))


def refuse_long_fields(table: pa.Table, source: str, first_row: int = 2) -> None:
    """Refuse texts of more than a megabyte. first_row: what the first row of the table is called."""
    faults = []
    for name in table.column_names:
        column = table[name]
        if not pa.types.is_dictionary(column.type):
            continue
        offset = 0
        for chunk in column.chunks:
            lengths = pc.binary_length(chunk.dictionary)
            longest = pc.max(lengths).as_py() or 0
            if longest > LONGEST_FIELD:
                at = lengths.to_numpy(zero_copy_only=False)[chunk.indices.fill_null(0).to_numpy()] > LONGEST_FIELD
                row = offset + int(np.argmax(at)) + first_row
                faults.append(fault("field-too-long", f"{in_column(source, name)}, row {row}", bytes=longest))
                break
            offset += len(chunk)
    if faults:
        raise InputFault(faults)


def _blank_lines(content: bytes, delimiter: str) -> tuple[Finding, ...]:
    """A note where a blank line stands before another row, so that row numbers are not those of an editor."""
    if BLANK_LINE.search(content) is None:
        return ()
    ends, _ = row_ends(content, ord(delimiter), final=True)
    blank = blank_lines(content, ends)
    rows = np.flatnonzero(text_of_rows(content, ends) > 0)
    return (finding("note", "blank-lines"),) if blank[: rows[-1]].any() else ()
