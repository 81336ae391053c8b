"""Tables as values: rows of typed cells, with what disclosure control must know about them."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

CellKind = Literal["text", "count", "percent", "number", "odds_ratio", "interval", "p"]


@dataclass(frozen=True, slots=True)
class Interval:
    """Lower and upper limit on the scale of its column; None where no limit exists or it is withheld."""

    lower: float | None
    upper: float | None


@dataclass(frozen=True, slots=True)
class Hidden:
    """Stands in a cell whose value was withheld."""

    reason: str = "small count"


Cell = str | int | float | Interval | Hidden | None
"""None is "there is no such number here": it is drawn as an empty cell."""


@dataclass(frozen=True, slots=True)
class TableColumn:
    """One column of a table.

    part_of: for a count, the key of the count in the same row that it is a part of (events of records);
        both the part and its complement are then protected.
    sums_known: for a count, whether its sum over the rows of a block is known to the reader (because the
        total is printed somewhere), so that one hidden cell needs a second one hidden with it.
    hidden_with: keys of counts in the same row whose hiding hides this cell too (a percentage, a mean).
    hidden_with_block: hide this cell when any count in its block is hidden (a crude odds ratio, which
        with the reference row would give a hidden cell away).
    said_once: whether a text that the row above in the same block has as well need not be shown again.
    rounded: for the smallest ("down") and the largest ("up") of some values, which belong to single records: how they
        are made coarse. other_end: the key of the column with the other end.
    """

    key: str
    heading: str
    kind: CellKind = "text"
    part_of: str | None = None
    sums_known: bool = False
    hidden_with: tuple[str, ...] = ()
    hidden_with_block: bool = False
    said_once: bool = False
    rounded: Literal["", "down", "up"] = ""
    other_end: str = ""


@dataclass(frozen=True, slots=True)
class Table:
    """A table; `blocks` numbers each row's block (rows of one variable), empty when all rows are one block.

    aside: its counts are hidden rather than those of other tables, where either would protect a small count; no
        estimate is made from them.
    """

    id: str
    title: str
    columns: tuple[TableColumn, ...]
    rows: tuple[tuple[Cell, ...], ...]
    note: str = ""
    blocks: tuple[int, ...] = field(default=())
    aside: bool = False
