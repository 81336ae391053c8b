"""Which column of the records a name in a formula means."""

from __future__ import annotations

import unicodedata
from collections.abc import Collection, Mapping, Sequence

from oddsmodel.design.faults import formula_fault, piece
from oddsmodel.errors import InputFault
from oddsmodel.plan.nearest import nearest


class ColumnNames:
    """Finds columns by name: exactly, or else by the one name that is the same text in another Unicode spelling."""

    def __init__(self, columns: Collection[str], outcome: str, where: str) -> None:
        in_order = isinstance(columns, Mapping | Sequence)
        self.names = tuple(columns) if in_order else tuple(sorted(columns))
        self.exact = frozenset(self.names)
        self.outcome, self.where = outcome, where
        self.alike: dict[str, list[str]] = {}
        for name in self.names:
            self.alike.setdefault(unicodedata.normalize("NFC", name), []).append(name)

    def found(self, name: str, at: int) -> str:
        """The column that `name` means. InputFault for the outcome, for no column and for two that look the same."""
        column = name if name in self.exact else self._spelled_otherwise(name, at)
        if same_text(name, self.outcome) or column == self.outcome:
            raise formula_fault("formula-outcome-on-right", self.where, at, outcome=piece(self.outcome))
        if column is None:
            raise self.unknown(name, at)
        return column

    def _spelled_otherwise(self, name: str, at: int) -> str | None:
        found = self.alike.get(unicodedata.normalize("NFC", name), [])
        if len(found) > 1:
            raise formula_fault("formula-column-ambiguous", self.where, at, column=piece(name), number=len(found))
        return found[0] if found else None

    def unknown(self, name: str, at: int) -> InputFault:
        near = nearest(name, (one for one in self.names if one != self.outcome))
        shown = piece(near) if near else ""
        return formula_fault("formula-column-unknown", self.where, at, column=piece(name), nearest=shown)


def same_text(one: str, other: str) -> bool:
    """Whether two names are the same text, whatever their Unicode spelling."""
    return one == other or unicodedata.normalize("NFC", one) == unicodedata.normalize("NFC", other)
