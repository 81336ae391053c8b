"""The places that faults of the records point to."""

from __future__ import annotations

from oddsmodel.plan.faults import fault, heading
from oddsmodel.wording.plain import quoted

__all__ = ["fault", "in_column", "in_plan"]


def in_column(source: str, column: str) -> str:
    """The place of a column in a file of records."""
    return f"{source}, column {quoted(column)}"


def in_plan(column: str, key: str = "") -> str:
    """The place of a column's section, or of a key in it, in the plan."""
    return f"the plan, {heading('columns', column)} {key}".rstrip()
