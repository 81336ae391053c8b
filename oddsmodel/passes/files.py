"""Rows on disk: a file a column, written once in source order, read task by task without a map into memory."""

from __future__ import annotations

import atexit
import os
import shutil
import tempfile
from collections.abc import Mapping, Sequence
from pathlib import Path
from types import TracebackType
from typing import Any, BinaryIO

import numpy as np
from numpy.typing import NDArray

from oddsmodel.passes.base import TASK_ROWS, Leaf, cut, joined, length_of

PREFIX = "oddsmodel-rows-"


class ScratchFolder:
    """A folder of its own for scratch files, gone when it is closed, when the program ends, and with its parent."""

    def __init__(self, within: Path | None = None) -> None:
        self.path = Path(tempfile.mkdtemp(prefix=PREFIX, dir=within))
        atexit.register(self.close)

    def close(self) -> None:
        """Remove the folder and all in it; may be called again."""
        shutil.rmtree(self.path, ignore_errors=True)
        atexit.unregister(self.close)

    def __enter__(self) -> ScratchFolder:
        return self

    def __exit__(self, kind: type[BaseException] | None, error: BaseException | None, at: TracebackType | None) -> None:
        self.close()


class ColumnWriter:
    """Writes rows, some at a time, into a file a column."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.rows = 0
        self._types: dict[str, np.dtype[Any]] = {}
        self._files: dict[str, Any] = {}

    def write(self, rows: Mapping[str, NDArray[Any]]) -> None:
        """Add rows; every call must give the same names and types."""
        if not self._files:
            self.folder.mkdir(parents=True, exist_ok=True)
            for number, (name, array) in enumerate(rows.items()):
                self._types[name] = array.dtype
                self._files[name] = (self.folder / f"column-{number}").open("wb")
        for name, array in rows.items():
            if array.dtype != self._types[name]:
                raise TypeError(f"{name} began as {self._types[name]} and goes on as {array.dtype}")
            self._files[name].write(np.ascontiguousarray(array).data)
        self.rows += length_of(rows)

    def close(self) -> ColumnFiles:
        """Finish writing; what was written can then be read."""
        for file in self._files.values():
            file.close()
        paths = {name: self.folder / f"column-{number}" for number, name in enumerate(self._types)}
        return ColumnFiles({name: path.open("rb") for name, path in paths.items()}, self._types, self.rows)


class ColumnFiles:
    """A source of rows in a file a column. Reads are explicit, so that nothing stays in memory longer than its task."""

    def __init__(self, files: Mapping[str, BinaryIO], types: Mapping[str, np.dtype[Any]], rows: int) -> None:
        self.rows = rows
        self._types = dict(types)
        self._files = dict(files)

    @property
    def names(self) -> tuple[str, ...]:
        return tuple(self._types)

    def read(self, first: int, last: int) -> Leaf:
        return {name: self.column(name, first, last) for name in self._types}

    def column(self, name: str, first: int, last: int) -> NDArray[Any]:
        """The rows first to last − 1 of one column."""
        kind = self._types[name]
        values = np.empty(last - first, dtype=kind)
        left = values.data.cast("B") if values.size else memoryview(b"")
        at = first * kind.itemsize
        while len(left):
            got = os.preadv(self._files[name].fileno(), [left], at)
            if got == 0:
                raise OSError("a scratch file is shorter than it was written")
            left, at = left[got:], at + got
        return values

    def only(self, names: Sequence[str]) -> ColumnFiles:
        return ColumnFiles(self._files, {name: self._types[name] for name in names}, self.rows)

    def selected(self, mask: str) -> SelectedRows:
        return SelectedRows(self, mask)


class SelectedRows:
    """The rows of a source of columns for which a mask is true; how many come before each task is counted once."""

    def __init__(self, whole: ColumnFiles, mask: str) -> None:
        self.whole, self.mask = whole, mask
        counts = [
            int(np.count_nonzero(whole.column(mask, first, min(first + TASK_ROWS, whole.rows))))
            for first in range(0, whole.rows, TASK_ROWS)
        ]
        self._before = np.concatenate([[0], np.cumsum(counts, dtype=np.int64)])
        self.rows = int(self._before[-1])

    def read(self, first: int, last: int) -> Leaf:
        parts: list[Leaf] = []
        block = int(np.searchsorted(self._before, first, side="right")) - 1
        while not parts or int(self._before[block]) < last:
            start = block * TASK_ROWS
            rows = self.whole.read(start, min(start + TASK_ROWS, self.whole.rows))
            chosen = np.flatnonzero(rows.pop(self.mask))
            before = int(self._before[block])
            parts.append(cut(rows, chosen[max(0, first - before) : last - before]))
            block += 1
            if block + 1 == self._before.size:
                break
        return joined(parts)

    def only(self, names: Sequence[str]) -> SelectedRows:
        raise TypeError("arrays are chosen before rows are selected")

    def selected(self, mask: str) -> SelectedRows:
        raise TypeError("rows are selected once")
