"""How a derived column came about, as a table."""

from __future__ import annotations

from oddsmodel.results.derived import DerivedColumn, DerivedCount
from oddsmodel.results.tables import Cell, Hidden, Table, TableColumn
from oddsmodel.wording import say


def derived_table(column: DerivedColumn) -> Table:
    """The cross-counts of a derived column with its sources. Columns that would be empty are left out."""
    columns = {
        "value": [one.value for one in column.counts],
        "source": [one.source for one in column.counts],
        "source_value": [one.source_value for one in column.counts],
        "records": [_records(one) for one in column.counts],
        "smallest": [one.smallest for one in column.counts],
        "largest": [one.largest for one in column.counts],
    }
    used: dict[str, list[Cell]] = {
        key: list(cells) for key, cells in columns.items() if any(cell not in ("", None) for cell in cells)
    }
    blocks = [0]
    for before, after in zip(column.counts[:-1], column.counts[1:], strict=True):
        blocks.append(blocks[-1] + (before.source != after.source))
    return Table(
        id=f"derived-{column.name}",
        title=say("derived-title", label=column.label),
        columns=tuple(
            TableColumn(key, say(f"derived-heading-{key.replace('_', '-')}"), _KINDS.get(key, "text")) for key in used
        ),
        rows=tuple(zip(*used.values(), strict=True)),
        note=say("derived-note", rule=column.rule, rounded_to=column.rounded_to),
        blocks=tuple(blocks) if column.counts else (),
    )


_KINDS = {"records": "count", "smallest": "number", "largest": "number"}


def _records(one: DerivedCount) -> Cell:
    return Hidden(say("count-hidden")) if one.records is None else one.records
