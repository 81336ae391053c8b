"""Tables with their hidden counts, and the shares and estimates that hang on these, taken out."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

from oddsmodel.disclosure.extremes import rounded_end
from oddsmodel.disclosure.hiding import Hiding
from oddsmodel.disclosure.system import Place
from oddsmodel.disclosure.table_counts import row_blocks, whole_number
from oddsmodel.results.tables import Cell, Hidden, Interval, Table, TableColumn
from oddsmodel.wording import say

RATIOS = ("odds_ratio", "interval")
"""Kinds of numbers that are the same estimate wherever they stand to the last digit."""


def hidden_estimates(table: Table, owner: Place, hiding: Hiding) -> Iterator[float]:
    """The estimates in a table that are hidden with a count: they must not stand anywhere else either."""
    state = _State(table, owner, hiding)
    for r, row in enumerate(table.rows):
        for column, cell in zip(table.columns, row, strict=True):
            if column.kind in RATIOS and column.hidden_with_block and state.hangs_on_hidden(r, column):
                yield from estimates_in(cell)


def estimates_in(cell: Cell) -> Iterator[float]:
    """The numbers of an estimate that tell it from another; 0 does not."""
    values = (cell.lower, cell.upper) if isinstance(cell, Interval) else (cell,)
    yield from (value for value in values if isinstance(value, float) and value != 0.0)


def disclosed_table(table: Table, owner: Place, hiding: Hiding) -> Table:
    """The table with `Hidden` in each cell that may not be shown; its words say no small number of records."""
    state = _State(table, owner, hiding)
    text = hiding.withheld.text
    rows = tuple(
        tuple(state.cell(r, k, column, row[k]) for k, column in enumerate(table.columns))
        for r, row in enumerate(table.rows)
    )
    columns = tuple(replace(column, heading=text(column.heading)) for column in table.columns)
    return replace(table, title=text(table.title), columns=columns, rows=rows, note=text(table.note))


class _State:
    """Which counts of a table are hidden, by row, block and column."""

    def __init__(self, table: Table, owner: Place, hiding: Hiding) -> None:
        self.table, self.owner, self.hiding = table, owner, hiding
        self.blocks = row_blocks(table)
        self.keys = [
            {column.key for k, column in enumerate(table.columns) if hiding.hides("cell", owner, r, k)}
            for r in range(len(table.rows))
        ]
        self.in_block: dict[int, bool] = {}
        for block, keys in zip(self.blocks, self.keys, strict=True):
            self.in_block[block] = self.in_block.get(block, False) or bool(keys)
        self.totals = set(self._hidden_totals())
        self.part_of = {column.key: column.part_of for column in table.columns}

    def _hidden_totals(self) -> Iterator[str]:
        """Keys of the columns whose total stands in a row of its own and is hidden there: no share of it may stand."""
        rows_of: dict[int, list[int]] = {}
        for row, block in enumerate(self.blocks):
            rows_of.setdefault(block, []).append(row)
        alone = [rows[0] for rows in rows_of.values() if len(rows) == 1]
        for k, column in enumerate(self.table.columns):
            hidden = {self.table.rows[row][k] for row in alone if column.key in self.keys[row]}
            several = (rows for rows in rows_of.values() if len(rows) > 1) if hidden else ()
            sums = {sum(whole_number(self.table.rows[row][k]) or 0 for row in rows) for rows in several}
            if hidden & sums:
                yield column.key

    def hangs_on_hidden(self, row: int, column: TableColumn) -> bool:
        """Whether a cell that is no count would give a hidden count away."""
        needed = set(column.hidden_with)
        needed |= {whole for key in column.hidden_with if (whole := self.part_of.get(key)) is not None}
        if needed & self.keys[row] or set(column.hidden_with) & self.totals:
            return True
        return column.hidden_with_block and self.in_block[self.blocks[row]]

    def cell(self, row: int, k: int, column: TableColumn, cell: Cell) -> Cell:
        if self.hiding.hides("cell", self.owner, row, k):
            return self._hidden("count-hidden")
        if cell is None or isinstance(cell, Hidden):
            return cell
        words_for_a_number = isinstance(cell, str) and column.kind != "text"
        if not words_for_a_number and self.hangs_on_hidden(row, column):
            return self._hidden("estimate-hidden")
        if isinstance(cell, str):
            return self.hiding.withheld.text(cell)
        if column.kind in RATIOS and any(one in self.hiding.withheld.estimates for one in estimates_in(cell)):
            return self._hidden("estimate-hidden")
        if column.rounded and isinstance(cell, int | float):
            return rounded_end(float(cell), row, column, self.table)
        return cell

    def _hidden(self, code: str) -> Hidden:
        self.hiding.taken += 1
        return Hidden(say(code))
