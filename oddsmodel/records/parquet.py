"""A Parquet file, or a folder of them, into an Arrow table."""

from __future__ import annotations

from pathlib import Path

import pyarrow as pa

from oddsmodel.errors import InputFault
from oddsmodel.records.faults import fault


def parquet_files(folder: Path) -> list[Path]:
    """The Parquet files in a folder and its subfolders, sorted by their path within it; hidden ones are passed over."""
    found = [path for path in folder.rglob("*") if path.is_file() and path.suffix.lower() in (".parquet", ".pq")]
    visible = [path for path in found if not any(part[0] in "._" for part in path.relative_to(folder).parts)]
    return sorted(visible, key=lambda path: path.relative_to(folder).as_posix())


def read_parquet(path: Path, source: str) -> pa.Table:
    """The rows of all files in the order of their names; `key=value` folders become columns.

    Raises: InputFault when a file is damaged or the files do not have the same columns.
    """
    import pyarrow.dataset as pa_dataset

    files = parquet_files(path) if path.is_dir() else [path]
    if not files:
        raise InputFault(fault("folder-without-parquet", source))
    try:
        columns = {tuple(pa_dataset.dataset(str(file), format="parquet").schema.names) for file in files}
        if len({frozenset(names) for names in columns}) > 1:
            raise InputFault(fault("parquet-files-differ", source))
        dataset = pa_dataset.dataset(
            [str(file) for file in files],
            format="parquet",
            partitioning="hive" if path.is_dir() else None,
            partition_base_dir=str(path) if path.is_dir() else None,
        )
        table = dataset.to_table()
    except (pa.ArrowInvalid, pa.ArrowTypeError, pa.ArrowNotImplementedError, OSError) as error:
        raise InputFault(fault("parquet-not-readable", source)) from error
    if table.num_rows == 0:
        raise InputFault(fault("no-rows", source))
    return table
