"""The counts of one table, and the sums that a reader knows between them."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import groupby

from oddsmodel.disclosure.system import ASIDE, CELL, CountSystem, Place
from oddsmodel.results.tables import Cell, Table, TableColumn

Signature = tuple[object, ...]


@dataclass(frozen=True, slots=True)
class Sighting:
    """A count, the table or flow it stands in, and the words that tell what it counts."""

    owner: Place
    number: int
    words: str


@dataclass(slots=True)
class Sightings:
    """Where the same count may stand twice.

    by_signature: the counts seen under a signature, by table. wholes: counts that are not a part of another in their
    row, by size. totals: sums of a table. Both with the words that tell what they count.
    """

    by_signature: dict[Signature, dict[Place, list[int]]] = field(default_factory=dict)
    wholes: dict[int, list[Sighting]] = field(default_factory=dict)
    totals: list[Sighting] = field(default_factory=list)

    def see(self, signature: Signature, owner: Place, number: int) -> None:
        self.by_signature.setdefault(signature, {}).setdefault(owner, []).append(number)


def whole_number(cell: Cell) -> int | None:
    """The count in a cell, or None where it holds none."""
    if isinstance(cell, bool):
        return None
    if isinstance(cell, int):
        return cell
    return int(cell) if isinstance(cell, float) and cell.is_integer() else None


def row_text(table: Table, row: Sequence[Cell]) -> str:
    """The words of a row ("Sex: female"), by which it can be told in other tables."""
    texts = (
        cell
        for column, cell in zip(table.columns, row, strict=True)
        if column.kind == "text" and not column.hidden_with and isinstance(cell, str)
    )
    return ": ".join(texts)


def row_blocks(table: Table) -> tuple[int, ...]:
    return table.blocks or (0,) * len(table.rows)


def count_cells(table: Table) -> Iterator[tuple[int, int]]:
    """Row and column of each cell that holds a count."""
    columns = [k for k, column in enumerate(table.columns) if column.kind == "count"]
    for r, row in enumerate(table.rows):
        for k in columns:
            if whole_number(row[k]) is not None:
                yield r, k


class TableCounts:
    """Enters the counts of a table into the system.

    scalars: counts that are printed beside every table (a model's records and events), by size. Sums of a column over
    a block are told to the reader by one of those, by a total row, or by a heading elsewhere (`sums_known`).
    """

    def __init__(
        self,
        system: CountSystem,
        sightings: Sightings,
        table: Table,
        owner: Place,
        scalars: Mapping[int, int],
        model: int,
    ) -> None:
        self.system, self.sightings, self.table, self.owner = system, sightings, table, owner
        self.scalars, self.model = scalars, model
        self.positions = {column.key: k for k, column in enumerate(table.columns) if column.kind == "count"}
        self.cells: dict[tuple[int, int], int] = {}
        rank = ASIDE if table.aside else CELL
        for r, k in count_cells(table):
            count = whole_number(table.rows[r][k]) or 0
            self.cells[r, k] = system.add(count, ("cell", owner, r, k), rank=rank, model=model)

    def enter(self) -> None:
        """All sums of the table, and the signatures of its counts."""
        totals = {
            (k, block): total
            for k in self.positions.values()
            for block, rows in self._blocks()
            if (total := self._column_sum(k, rows)) is not None
        }
        for row in range(len(self.table.rows)):
            self._row_sums(row, totals)
            self._sum_across(row)
            self._sign_row(row, totals)

    def _blocks(self) -> Iterator[tuple[int, list[int]]]:
        numbered = sorted(enumerate(row_blocks(self.table)), key=lambda pair: (pair[1], pair[0]))
        for block, members in groupby(numbered, key=lambda pair: pair[1]):
            yield block, [row for row, _ in members]

    def _sum_is_told(self, column: TableColumn) -> bool:
        """A share of the column's total gives the total away from any row whose count and share are both shown."""
        shares = any(other.kind == "percent" and column.key in other.hidden_with for other in self.table.columns)
        return column.sums_known or shares

    def _column_sum(self, k: int, rows: list[int]) -> int | None:
        """The sum of a column over a block as a count of the system; the cell itself where it stands alone."""
        found = [self.cells[row, k] for row in rows if (row, k) in self.cells]
        if not found or any(not self._is_empty(row, k) and (row, k) not in self.cells for row in rows):
            return None
        column = self.table.columns[k]
        if self._ends_with_total(rows):
            self.system.relate(found[:-1], found[-1])
        value = sum(self.system.value(number) for number in found)
        known = self.scalars.get(value)
        if known is None and (known := self._alone(k, value)) is not None:
            self.sightings.totals.append(Sighting(self.owner, known, column.heading))
        if known is None and len(found) > 1 and self._sum_is_told(column):
            known = self.system.add(value, total=True, model=self.model)
            self.sightings.totals.append(Sighting(self.owner, known, column.heading))
        if known is not None and found != [known]:
            self.system.relate(found, known)
        return known

    def _is_empty(self, row: int, k: int) -> bool:
        return self.table.rows[row][k] is None

    def _alone(self, k: int, value: int) -> int | None:
        """A cell that is the only one of its block and has this value: the column's total in a row of its own."""
        if value == 0:
            return None
        for _, rows in self._blocks():
            own = [self.cells[row, k] for row in rows if (row, k) in self.cells]
            if len(own) == 1 and self.system.value(own[0]) == value:
                return own[0]
        return None

    def _ends_with_total(self, rows: list[int]) -> bool:
        """Whether at least two columns show the last row of a block to be the sum of at least two others."""
        *others, last = rows
        columns = [k for k in self.positions.values() if all((row, k) in self.cells for row in rows)]
        if len(others) < 2 or len(columns) < 2:
            return False
        value = self.system.value
        sums = all(sum(value(self.cells[row, k]) for row in others) == value(self.cells[last, k]) for k in columns)
        return sums and any(value(self.cells[last, k]) for k in columns)

    def _wholes(self) -> dict[int, list[int]]:
        """The count columns that others are parts of, with these parts."""
        found: dict[int, list[int]] = {}
        for column in self.table.columns:
            if column.part_of in self.positions and column.key in self.positions:
                found.setdefault(self.positions[column.part_of], []).append(self.positions[column.key])
        return found

    def _row_sums(self, row: int, totals: Mapping[tuple[int, int], int]) -> None:
        """Parts of a whole: they add up to it, or each leaves a complement that anyone can work out."""
        value, block = self.system.value, row_blocks(self.table)[row]
        for whole, parts in self._wholes().items():
            if (row, whole) not in self.cells or any((row, part) not in self.cells for part in parts):
                continue
            total = self.cells[row, whole]
            numbers = [self.cells[row, part] for part in parts]
            if len(numbers) > 1 and sum(map(value, numbers)) == value(total):
                self.system.relate(numbers, total)
                continue
            for part, number in zip(parts, numbers, strict=True):
                if value(number) > value(total):
                    continue
                rest = self.system.add(value(total) - value(number), model=self.model)
                self.system.relate([number, rest], total)
                sums = totals.get((whole, block)), totals.get((part, block))
                others = value(sums[0]) - value(sums[1]) if sums[0] is not None and sums[1] is not None else None
                self._sign(rest, row, value(total), others)

    def _sum_across(self, row: int) -> None:
        """Groups side by side: the sum over them may stand in another table."""
        parts = {self.positions[c.key] for c in self.table.columns if c.part_of in self.positions and c.kind == "count"}
        groups = [k for k in self.positions.values() if k not in parts and self.table.columns[k].sums_known]
        numbers = [self.cells[row, k] for k in groups if (row, k) in self.cells]
        if len(groups) < 2 or len(numbers) < len(groups):
            return
        value = sum(self.system.value(number) for number in numbers)
        known = self.scalars.get(value)
        if known is None:
            known = self.system.add(value, model=self.model)
            self.sightings.totals.append(Sighting(self.owner, known, row_text(self.table, self.table.rows[row])))
            self._sign(known, row, None, None)
        self.system.relate(numbers, known)

    def _sign_row(self, row: int, totals: Mapping[tuple[int, int], int]) -> None:
        value, block = self.system.value, row_blocks(self.table)[row]
        whole_of = {part: whole for whole, parts in self._wholes().items() for part in parts}
        for k in self.positions.values():
            if (row, k) not in self.cells:
                continue
            number, total = self.cells[row, k], totals.get((k, block))
            whole = self.cells.get((row, whole_of[k])) if k in whole_of else None
            if whole is None:
                words = row_text(self.table, self.table.rows[row])
                self.sightings.wholes.setdefault(value(number), []).append(Sighting(self.owner, number, words))
            in_row = value(whole) if whole is not None else None
            self._sign(number, row, in_row, value(total) if total is not None and total != number else None)

    def _sign(self, number: int, row: int, in_row: int | None, in_column: int | None) -> None:
        """Signatures under which the same count can be found elsewhere: by its row's words, by what it is a part of."""
        value = self.system.value(number)
        words = row_text(self.table, self.table.rows[row])
        if words:
            self.sightings.see(("row", words, value, in_row), self.owner, number)
            self.sightings.see(("row", words, value), self.owner, number)
        around = [total for total in (in_row, in_column) if total]
        if len(around) == 2:
            self.sightings.see(("part of both", value, *sorted(around)), self.owner, number)
