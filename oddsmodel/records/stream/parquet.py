"""A Parquet file, or a folder of them, read in blocks of rows by its row groups."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import pyarrow as pa

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.records.arrow import beyond_whole_bound, plain_values, what_it_holds, word_for
from oddsmodel.records.faults import fault
from oddsmodel.records.header import vetted_names
from oddsmodel.records.parquet import parquet_dataset, parquet_files
from oddsmodel.records.source import file_sha256, folder_sha256
from oddsmodel.records.stream.source import Piece

BUFFER = 1 << 20
BYTES_OF_A_CODE = 4
BYTES_OF_A_DICTIONARY = 1 << 20
TEXTS = pa.dictionary(pa.int32(), pa.string())
UNREADABLE = (pa.ArrowInvalid, pa.ArrowTypeError, pa.ArrowNotImplementedError, OSError)


@dataclass(frozen=True, slots=True)
class ParquetPart:
    """A file: the rows of its row groups, and the columns that its folder's name gives (`key=value`)."""

    path: str
    groups: tuple[int, ...]
    constants: Mapping[str, Any]

    @property
    def rows(self) -> int:
        return sum(self.groups)


@dataclass(frozen=True)
class ParquetSource:
    """See `Source`. schema: of the first file, to which the others are cast. with_few_texts: columns (by their names in
    the file) that are read as a dictionary of their texts and codes. as_texts: whole numbers kept as texts."""

    path: Path
    schema: pa.Schema
    parts: tuple[ParquetPart, ...]
    names: tuple[str, ...]
    block_rows: int
    with_few_texts: frozenset[str] = frozenset()
    as_texts: frozenset[str] = frozenset()
    findings: tuple[Finding, ...] = ()
    first_row: int = 1
    reads_numbers_from_texts = False
    any_order = False

    @property
    def name(self) -> str:
        return self.path.name

    @property
    def rows(self) -> int:
        return sum(part.rows for part in self.parts)

    @property
    def blocks(self) -> int:
        return -(-self.rows // self.block_rows)

    @property
    def refused(self) -> Mapping[str, str]:
        types = [(name, _plain_type(self.schema.field(at).type)) for at, name in enumerate(self.names)]
        return {name: word_for(kind) for name, kind in types if what_it_holds(kind) == "no plain values"}

    def sha256(self) -> str:
        return folder_sha256(self.path) if self.path.is_dir() else file_sha256(self.path)

    def has_own_dictionary(self, column: str) -> bool:
        kind = _plain_type(self._field(column).type)
        return bool(pa.types.is_dictionary(kind)) and what_it_holds(kind) == "texts"

    def keeps_as_texts(self, column: str) -> bool:
        return column in self.as_texts

    def settled(self, types: Mapping[str, pa.DataType], as_texts: Collection[str]) -> ParquetSource:
        return replace(self, as_texts=self.as_texts | set(as_texts))

    def reviewed(self, texts: Mapping[str, pa.Array]) -> None:
        return None

    def pieces(self, columns: Sequence[str]) -> Iterator[Piece]:
        whole = [
            name
            for name in columns
            if name not in self.as_texts and what_it_holds(_plain_type(self._field(name).type)) == "whole numbers"
        ]
        for table in self.tables(columns):
            yield Piece(table, large=[name for name in whole if beyond_whole_bound(table[name])])

    def tables(self, columns: Sequence[str], first: int = 0, end: int | None = None) -> Iterator[pa.Table]:
        last = self.rows if end is None else min(self.rows, end * self.block_rows)
        wanted, waiting = last - first * self.block_rows, 0
        parts: list[pa.Table] = []
        for table in self._from_row(first * self.block_rows, columns):
            while table.num_rows and wanted:
                taken = table.slice(0, min(self.block_rows - waiting, wanted))
                table = table.slice(taken.num_rows)
                parts.append(taken)
                waiting, wanted = waiting + taken.num_rows, wanted - taken.num_rows
                if waiting == self.block_rows or not wanted:
                    yield pa.concat_tables(parts)
                    parts, waiting = [], 0
            if not wanted:
                return
        raise InputFault(fault("file-changed", self.name))

    def _from_row(self, row: int, columns: Sequence[str]) -> Iterator[pa.Table]:
        """Everything from a row on, as it comes."""
        for part in self.parts:
            if row >= part.rows:
                row -= part.rows
                continue
            group = 0
            while row >= part.groups[group]:
                row -= part.groups[group]
                group += 1
            try:
                for table in self._of_part(part, group, columns):
                    if row < table.num_rows:
                        yield table.slice(row)
                    row = max(0, row - table.num_rows)
            except UNREADABLE as error:
                raise InputFault(fault("parquet-not-readable", self.name)) from error

    def _of_part(self, part: ParquetPart, group: int, columns: Sequence[str]) -> Iterator[pa.Table]:
        """The batches of a file from a row group on."""
        import pyarrow.parquet as pa_parquet

        fields = {name: self._field(name) for name in columns}
        physical = [field.name for field in fields.values() if field.name not in part.constants]
        coded = [name for name in physical if name in self.with_few_texts]
        with pa_parquet.ParquetFile(part.path, read_dictionary=coded, pre_buffer=False, buffer_size=BUFFER) as file:
            groups = list(range(group, len(part.groups)))
            rows_alone = physical or file.schema_arrow.names[:1]
            for batch in file.iter_batches(self.block_rows, row_groups=groups, columns=rows_alone):
                arrays = [self._column(batch, part, field) for field in fields.values()]
                yield pa.Table.from_arrays(arrays, names=list(fields))

    def _column(self, batch: pa.RecordBatch, part: ParquetPart, field: pa.Field) -> pa.ChunkedArray:
        if field.name in part.constants:
            array = pa.repeat(pa.scalar(part.constants[field.name], field.type), batch.num_rows)
        else:
            array = batch.column(field.name)
        kind = TEXTS if field.name in self.with_few_texts else field.type
        if array.type != kind:
            array = array.cast(field.type)
            array = array.dictionary_encode() if kind is TEXTS else array
        return plain_values(pa.chunked_array([array]))

    def _field(self, name: str) -> pa.Field:
        return self.schema.field(self.names.index(name))


def open_parquet(path: Path, block_rows: int) -> ParquetSource:
    """A Parquet file or folder. Raises: InputFault as `read_parquet` does."""
    import pyarrow.dataset as pa_dataset
    import pyarrow.parquet as pa_parquet

    name = path.name
    try:
        dataset = parquet_dataset(path, name)
        folders = {one.path: pa_dataset.get_partition_keys(one.partition_expression) for one in dataset.get_fragments()}
        parts, files = [], []
        for file in parquet_files(path) if path.is_dir() else [path]:
            metadata = pa_parquet.read_metadata(str(file))
            groups = tuple(metadata.row_group(at).num_rows for at in range(metadata.num_row_groups))
            parts.append(ParquetPart(str(file), groups, folders.get(str(file), {})))
            files.append(metadata)
    except UNREADABLE as error:
        raise InputFault(fault("parquet-not-readable", name)) from error
    if not any(part.rows for part in parts):
        raise InputFault(fault("no-rows", name))
    names = vetted_names(dataset.schema.names, name)
    few = frozenset(_with_few_texts(dataset.schema, files))
    return ParquetSource(path, dataset.schema, tuple(parts), tuple(names), block_rows, few)


def _with_few_texts(schema: pa.Schema, files: Iterable[Any]) -> Iterator[str]:
    """The columns whose values take so few bytes in the files (their metadata) that most must be codes of texts."""
    texts = {field.name for field in schema if pa.types.is_string(field.type)}
    bytes_of, values_of = Counter[str](), Counter[str]()
    for metadata in files:
        for group in range(metadata.num_row_groups):
            for at in range(metadata.num_columns):
                column = metadata.row_group(group).column(at)
                if column.path_in_schema in texts:
                    bytes_of[column.path_in_schema] += column.total_uncompressed_size
                    values_of[column.path_in_schema] += column.num_values
    yield from (name for name in texts if bytes_of[name] <= BYTES_OF_A_DICTIONARY + BYTES_OF_A_CODE * values_of[name])


def _plain_type(kind: pa.DataType) -> pa.DataType:
    return plain_values(pa.chunked_array([], type=kind)).type
