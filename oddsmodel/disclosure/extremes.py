"""The smallest and the largest of some values belong to single records: they are told in coarse steps."""

from __future__ import annotations

import math

from oddsmodel.disclosure.table_counts import row_blocks
from oddsmodel.results.tables import Table, TableColumn

STEPS = 20
"""The range of a column is told in about this many steps."""
WHOLE_STEP = 2.0
"""So that a largest value told as 8 is 7 or 8."""


def rounded_end(value: float, row: int, column: TableColumn, table: Table) -> float:
    """The end of a range in a row, rounded outwards to a multiple of the step of its block in both columns of ends."""
    step = _step(table, row, {column.key, column.other_end})
    if step == 0.0:
        return value
    multiple = math.floor(value / step) if column.rounded == "down" else math.ceil(value / step)
    return float(f"{multiple * step:.12g}")


def _step(table: Table, row: int, keys: set[str]) -> float:
    """1, 2 or 5 times a power of ten, at least 1/20 of the whole range, and 2 for whole numbers; 0 where all values
    are the same.

    What all records share tells of no one record.
    """
    places = [k for k, column in enumerate(table.columns) if column.key in keys]
    blocks = row_blocks(table)
    rows = [one for one, block in zip(table.rows, blocks, strict=True) if block == blocks[row]]
    ends = [float(cell) for one in rows for k in places if isinstance(cell := one[k], int | float)]
    width = (max(ends) - min(ends)) / STEPS if ends else 0.0
    if width <= 0.0:
        return 0.0
    power = 10.0 ** math.floor(math.log10(width))
    step = next(power * times for times in (1, 2, 5, 10, 20) if power * times >= width)
    return max(step, WHOLE_STEP) if all(end.is_integer() for end in ends) else step
