"""What a stream asks of a file of records, whatever its kind."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Protocol

import pyarrow as pa

from oddsmodel.findings import Finding

BLOCK = 262_144
"""Rows of a block, at most: 64 leaves of the passes."""
LEAF = 4096


@dataclass(frozen=True, slots=True)
class Piece:
    """A block as it is surveyed. doubtful: columns that must be read as texts, for what was met in them here; large:
    columns with whole numbers too large to be told apart, which must be so if all their blocks hold whole numbers."""

    table: pa.Table
    doubtful: Collection[str] = ()
    large: Collection[str] = ()


class Source(Protocol):
    """A file or folder of records that is read in blocks, any number of times. It can be pickled.

    name: what messages call it. names: of its columns; refused: those that hold no plain values, and what they hold.
    rows, blocks: how many. first_row: what its first row is called. reads_numbers_from_texts: whether the types of its
    columns are told from what is written in them. any_order: whether a block costs the same alone as after another one.
    """

    @property
    def name(self) -> str: ...

    @property
    def names(self) -> tuple[str, ...]: ...

    @property
    def refused(self) -> Mapping[str, str]: ...

    @property
    def findings(self) -> tuple[Finding, ...]: ...

    @property
    def rows(self) -> int: ...

    @property
    def blocks(self) -> int: ...

    @property
    def first_row(self) -> int: ...

    @property
    def reads_numbers_from_texts(self) -> bool: ...

    @property
    def any_order(self) -> bool: ...

    def sha256(self) -> str: ...

    def has_own_dictionary(self, column: str) -> bool:
        """Whether the texts of a column come with a dictionary whose order is to be kept."""

    def keeps_as_texts(self, column: str) -> bool:
        """Whether the whole numbers of a column are kept as texts."""

    def pieces(self, columns: Sequence[str]) -> Iterator[Piece]:
        """All blocks of some columns, as they are first met. Raises: InputFault for a file that cannot be read."""

    def tables(self, columns: Sequence[str], first: int = 0, end: int | None = None) -> Iterator[pa.Table]:
        """Blocks `first` up to `end` of some columns, each read as `settled` says. Raises: InputFault as `pieces`."""

    def settled(self, types: Mapping[str, pa.DataType], as_texts: Collection[str]) -> Source:
        """The same with the types of some columns settled, and those that are kept as texts."""

    def reviewed(self, texts: Mapping[str, pa.Array]) -> Source | None:
        """How it must be read instead, once all different texts of its columns of texts are known; None: as it was.

        Raises: InputFault where that cannot be told.
        """


def rows_of_blocks(memory: int, columns: int) -> int:
    """How many rows a block has, so that its columns take an eighth of the memory (bytes): whole leaves, at most BLOCK.

    A row of a column takes some 32 bytes on its way from the file to coded records.
    """
    fitting = memory // 8 // (32 * max(columns, 1))
    return min(BLOCK, max(LEAF, fitting // LEAF * LEAF))
