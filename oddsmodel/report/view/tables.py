"""Tables as they are shown: every cell a text, with what the page must know to set it."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from oddsmodel.results.tables import Cell, CellKind, Hidden, Interval, Table, TableColumn
from oddsmodel.wording import numbers, say

MOST_DIGITS = 6


@dataclass(frozen=True, slots=True)
class CellView:
    """`stem` is the beginning that a row has in common with the rows of its block, told apart so that it can recede.
    wordy: numbers among so many words that they may be broken over lines."""

    text: str
    numeric: bool = False
    withheld: bool = False
    stem: str = ""
    wordy: bool = False


@dataclass(frozen=True, slots=True)
class RowView:
    cells: tuple[CellView, ...]
    starts_block: bool


@dataclass(frozen=True, slots=True)
class TableView:
    """`headings` pairs each heading with whether its column is of numbers."""

    id: str
    number: int
    title: str
    headings: tuple[tuple[str, bool], ...]
    rows: tuple[RowView, ...]
    note: str


def table_view(table: Table, number: int, hide_counts_below: int) -> TableView:
    """The table with its cells in words."""
    columns = list(zip(*table.rows, strict=True)) if table.rows else [() for _ in table.columns]
    writers = [_writer(column, cells) for column, cells in zip(table.columns, columns, strict=True)]
    blocks = table.blocks or (0,) * len(table.rows)
    stems = _stems(table, blocks)
    rows = []
    for place, cells in enumerate(table.rows):
        first = place > 0 and blocks[place] != blocks[place - 1]
        views = [_cell(cell, column, write) for cell, column, write in zip(cells, table.columns, writers, strict=True)]
        if place and not first:
            views = [
                CellView("") if column.said_once and cell == above else view
                for view, column, cell, above in zip(views, table.columns, cells, table.rows[place - 1], strict=True)
            ]
        if stems[place]:
            views[0] = CellView(text=views[0].text[len(stems[place]) :], stem=stems[place])
        rows.append(RowView(tuple(views), first))
    note = table.note
    if any(isinstance(cell, Hidden) for cells in table.rows for cell in cells):
        note = f"{note} {say('hidden-cells-note', below=hide_counts_below)}".strip()
    headings = tuple((column.heading, column.kind != "text") for column in table.columns)
    return TableView(f"table-{number}", number, table.title, headings, tuple(rows), note)


def _cell(cell: Cell, column: TableColumn, write: Callable[[Cell], str]) -> CellView:
    if isinstance(cell, Hidden):
        return CellView(say("cell-withheld"), numeric=column.kind != "text", withheld=True)
    if cell is None:
        return CellView("", numeric=column.kind != "text")
    if isinstance(cell, str):
        return CellView(cell, numeric=column.kind != "text")
    wordy = isinstance(cell, Interval) and (cell.lower is None or cell.upper is None)
    return CellView(write(cell), numeric=True, wordy=wordy)


def _writer(column: TableColumn, cells: Sequence[Cell]) -> Callable[[Cell], str]:
    """How the numbers of one column are written: all alike."""
    digits = _digits(cells)
    if column.kind == "number" or (column.kind == "interval" and not _is_ratio(cells)):
        return lambda cell: _plain(cell, digits)
    return lambda cell: _of_kind(cell, column.kind, digits)


def _of_kind(cell: Cell, kind: CellKind, digits: int) -> str:
    if isinstance(cell, Interval):
        return numbers.interval(cell.lower, cell.upper)
    if not isinstance(cell, int | float):
        return str(cell)
    match kind:
        case "count":
            return numbers.count(round(cell))
        case "percent":
            return numbers.percent(cell)
        case "odds_ratio":
            return numbers.ratio(cell)
        case "p":
            return numbers.p_value(cell)
        case _:
            return _plain(cell, digits)


def _plain(cell: Cell, digits: int) -> str:
    if isinstance(cell, Interval):
        if cell.lower is None or cell.upper is None:
            return say("cell-no-limit")
        return f"{_plain(cell.lower, digits)} to {_plain(cell.upper, digits)}"
    if isinstance(cell, int | float):
        grouped = abs(cell) >= 10_000 and digits == 0
        return numbers.count(round(cell)).replace("-", "\u2212") if grouped else numbers.decimal(cell, digits)
    return str(cell)


def _values(cells: Sequence[Cell]) -> list[float]:
    limits = [limit for cell in cells if isinstance(cell, Interval) for limit in (cell.lower, cell.upper)]
    single = [cell for cell in cells if isinstance(cell, int | float)]
    return [float(value) for value in (*limits, *single) if value is not None]


def _is_ratio(cells: Sequence[Cell]) -> bool:
    """Whether limits can be odds ratios: none is below zero."""
    return all(value >= 0 for value in _values(cells))


def _digits(cells: Sequence[Cell]) -> int:
    """Decimals that leave the largest number of a column three figures, at least one; none where all are whole."""
    values = [abs(value) for value in _values(cells) if value != 0]
    if all(value == int(value) for value in values):
        return 0
    largest = max(values)
    return 0 if largest >= 1000 else min(max(2 - math.floor(math.log10(largest)), 1), MOST_DIGITS)


def _stems(table: Table, blocks: Sequence[int]) -> list[str]:
    """For each row that is not its block's first: the beginning up to a colon that it shares with the row above."""
    stems = [""] * len(table.rows)
    for place in range(1, len(table.rows)):
        above, here = table.rows[place - 1][0], table.rows[place][0]
        if blocks[place] == blocks[place - 1] and isinstance(above, str) and isinstance(here, str):
            stem, colon, _ = here.rpartition(": ")
            if here == above:
                stems[place] = here
            elif colon and above.startswith(f"{stem}: "):
                stems[place] = f"{stem}: "
    return stems
