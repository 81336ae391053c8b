"""A Parquet file, or a folder of them, into an Arrow table."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import pyarrow as pa

from oddsmodel.errors import InputFault
from oddsmodel.records.faults import fault

if TYPE_CHECKING:
    import pyarrow.dataset as pa_dataset


def parquet_files(folder: Path) -> list[Path]:
    """The Parquet files in a folder and its subfolders, sorted by their path within it; hidden ones are passed over."""
    found = [path for path in folder.rglob("*") if path.is_file() and path.suffix.lower() in (".parquet", ".pq")]
    visible = [path for path in found if not any(part[0] in "._" for part in path.relative_to(folder).parts)]
    return sorted(visible, key=lambda path: path.relative_to(folder).as_posix())


def parquet_dataset(path: Path, source: str) -> pa_dataset.Dataset:
    """All files in the order of their names; `key=value` folders become columns.

    Raises: InputFault for a folder without files and for files that do not have the same columns.
    """
    import pyarrow.dataset as pa_dataset

    files = parquet_files(path) if path.is_dir() else [path]
    if not files:
        raise InputFault(fault("folder-without-parquet", source))
    columns = {tuple(pa_dataset.dataset(str(file), format="parquet").schema.names) for file in files}
    if len({frozenset(names) for names in columns}) > 1:
        raise InputFault(fault("parquet-files-differ", source))
    return pa_dataset.dataset(
        [str(file) for file in files],
        format="parquet",
        partitioning="hive" if path.is_dir() else None,
        partition_base_dir=str(path) if path.is_dir() else None,
    )


def read_parquet(path: Path, source: str) -> pa.Table:
    """The rows of all files. Raises: InputFault as `parquet_dataset`, when a file is damaged, and for no rows."""
    try:
        table = parquet_dataset(path, source).to_table()
    except (pa.ArrowInvalid, pa.ArrowTypeError, pa.ArrowNotImplementedError, OSError) as error:
        raise InputFault(fault("parquet-not-readable", source)) from error
    if table.num_rows == 0:
        raise InputFault(fault("no-rows", source))
    return table
