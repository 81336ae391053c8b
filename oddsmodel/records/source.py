"""From a path to a raw table: what kind of file it is, its checksum, its columns as numbers and texts."""

from __future__ import annotations

import hashlib
from collections.abc import Collection, Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

import pandas as pd
import pyarrow as pa

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.records.arrow import raw_column
from oddsmodel.records.delimited import read_delimited
from oddsmodel.records.faults import fault
from oddsmodel.records.header import vetted_names
from oddsmodel.records.parquet import parquet_files, read_parquet
from oddsmodel.records.python_values import series_column, values_column
from oddsmodel.records.raw import RawColumn, RawTable
from oddsmodel.records.spreadsheet import read_spreadsheet
from oddsmodel.wording import finding

PARQUET, ZIP, OLD_SPREADSHEET, GZIP = b"PAR1", b"PK\x03\x04", b"\xd0\xcf\x11\xe0", b"\x1f\x8b"


def read_table(path: Path, *, text_columns: Collection[str] = (), not_recorded: Sequence[str] = ("",)) -> RawTable:
    """The table in a CSV, TSV, Parquet or .xlsx file or in a folder of Parquet files.

    What kind of file it is, is told from its first bytes, not from its name.
    text_columns: columns of delimited text that are kept as written ("01" is not 1).
    not_recorded: texts that do not keep a column of delimited text from being one of numbers.

    Raises: InputFault for a path that cannot be read and for everything that the readers refuse.
    """
    if path.is_dir():
        return _from_arrow(read_parquet(path, path.name), path.name, folder_sha256(path))
    if not path.exists():
        raise InputFault(fault("file-missing", str(path)))
    if not path.is_file():
        raise InputFault(fault("file-not-regular", str(path)))
    try:
        data = path.read_bytes()
    except OSError as error:
        raise InputFault(fault("file-not-readable", str(path), reason=error.strerror or "")) from error
    sha256 = hashlib.sha256(data).hexdigest()
    if data.startswith(PARQUET):
        return _from_arrow(read_parquet(path, path.name), path.name, sha256)
    if data.startswith(ZIP):
        columns, notes = read_spreadsheet(data, path.name)
        found = ((name, values_column(values)) for name, values in columns.items())
        return assembled(found, path.name, sha256, notes)
    if data.startswith((OLD_SPREADSHEET, GZIP)):
        code = "packed-file" if data.startswith(GZIP) else "old-spreadsheet"
        raise InputFault(fault(code, path.name))
    table, notes = read_delimited(data, path.name, text_columns=text_columns, not_recorded=not_recorded)
    return _from_arrow(table, path.name, sha256, notes, first_row=2)


def table_from_frame(frame: pd.DataFrame) -> RawTable:
    """A data frame's columns as a raw table; its index is passed over and its first row is called 1.

    Raises: InputFault for no rows and for names that are empty or given twice.
    """
    source = "data frame"
    if len(frame) == 0:
        raise InputFault(fault("no-rows", source))
    names = vetted_names([str(name) for name in frame.columns], source)
    found = [(name, series_column(frame.iloc[:, position])) for position, name in enumerate(names)]
    digest = hashlib.sha256()
    for name, column in found:
        digest.update(name.encode("utf-8") + b"\0")
        if isinstance(column, RawColumn):
            digest.update(pd.util.hash_pandas_object(column.values, index=False).to_numpy().tobytes())
    return assembled(found, source, digest.hexdigest(), (), first_row=1)


def _from_arrow(
    table: pa.Table, source: str, sha256: str, notes: tuple[Finding, ...] = (), first_row: int = 1
) -> RawTable:
    names = vetted_names(table.column_names, source)
    found = ((name, raw_column(table.column(position))) for position, name in enumerate(names))
    return assembled(found, source, sha256, notes, first_row=first_row)


def assembled(
    columns: Iterable[tuple[str, RawColumn | str]],
    source: str,
    sha256: str,
    notes: tuple[Finding, ...],
    first_row: int = 2,
) -> RawTable:
    """Columns as a raw table, with notes on what was repaired in them; those that hold no plain values are left out."""
    found = dict(columns)
    raw = {name: column for name, column in found.items() if isinstance(column, RawColumn)}
    refused = {name: column for name, column in found.items() if isinstance(column, str)}
    frame: pd.DataFrame = pd.DataFrame({name: column.values for name, column in raw.items()}, copy=False)
    return RawTable(
        frame=frame,
        types={name: column.type for name, column in raw.items()},
        source=source,
        sha256=sha256,
        findings=(*notes, *told_of_columns(raw, refused)),
        refused=refused,
        first_row=first_row,
    )


def told_of_columns(raw: Mapping[str, RawColumn], refused: Mapping[str, str]) -> tuple[Finding, ...]:
    """Notes on what was repaired in columns, and on those that hold no plain values."""
    notes = _repairs("spaces-removed", {name: column.stripped for name, column in raw.items()})
    notes += _repairs("characters-removed", {name: column.cleaned for name, column in raw.items()})
    if refused:
        notes += (finding("note", "columns-left-out", columns=list(refused), hold=list(refused.values())),)
    return notes


def _repairs(code: str, changed: dict[str, int]) -> tuple[Finding, ...]:
    columns: list[Any] = [name for name, records in changed.items() if records]
    return (finding("note", code, columns=columns, records=sum(changed.values())),) if columns else ()


def file_sha256(path: Path) -> str:
    """Checksum of the bytes of a file."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def folder_sha256(folder: Path) -> str:
    """Checksum of the names and bytes of a folder's Parquet files, in the order of their names."""
    digest = hashlib.sha256()
    for path in parquet_files(folder):
        digest.update(path.relative_to(folder).as_posix().encode("utf-8") + b"\0")
        with path.open("rb") as file:
            digest.update(hashlib.file_digest(file, "sha256").digest())
    return digest.hexdigest()
