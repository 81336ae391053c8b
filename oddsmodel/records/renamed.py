"""Columns that the plan calls otherwise than the file does."""

from __future__ import annotations

from dataclasses import replace

from oddsmodel.errors import Fault
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.records.faults import fault, in_plan
from oddsmodel.records.raw import RawTable
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted


def file_name(name: str, plan: StudyPlan) -> str:
    """What the file calls a column of the plan."""
    section = plan.columns.get(name)
    return name if section is None or section.from_name is None else section.from_name


def renamed(table: RawTable, plan: StudyPlan) -> tuple[RawTable, list[Fault]]:
    """The table with the plan's names, which are told in a note, and faults where the file has a name already.

    A name of the file that is missing is left to be told with the other columns that are missing.
    """
    known = {*table.frame.columns, *table.refused}
    sought = {name: file_name(name, plan) for name in plan.columns}
    changed = {of_file: name for name, of_file in sought.items() if of_file != name and of_file in known}
    faults = [
        fault("renamed-name-taken", in_plan(name, "from"), column=quoted(name), file_name=quoted(of_file))
        for of_file, name in changed.items()
        if name in known and name not in changed
    ]
    if not changed or faults:
        return table, faults
    told = finding("note", "columns-renamed", columns=list(changed.values()), file=list(changed))
    return (
        replace(
            table,
            frame=table.frame.rename(columns=changed),
            types={changed.get(name, name): kind for name, kind in table.types.items()},
            refused={changed.get(name, name): holds for name, holds in table.refused.items()},
            findings=(*table.findings, told),
        ),
        [],
    )
