"""Which columns cannot stand in a formula, and why."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from oddsmodel.errors import Fault
from oddsmodel.records.faults import fault
from oddsmodel.records.types import Column
from oddsmodel.wording.plain import quoted


def unusable_in_formula(columns: Mapping[str, Column], used: Iterable[str], where: str) -> list[Fault]:
    """The faults of dates and identifiers among the columns that a formula uses.

    where: the place of the formula (the plan and its model).
    """
    return [
        fault(f"{columns[name].kind}-in-formula", where, column=quoted(name))
        for name in used
        if name in columns and columns[name].kind in ("date", "identifier")
    ]
