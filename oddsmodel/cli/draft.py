"""`draft`: a starter plan from what a file of records holds."""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING

from oddsmodel.cli.ending import DONE
from oddsmodel.cli.terminal import tell, write_as_is
from oddsmodel.errors import InputFault
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain, quoted

if TYPE_CHECKING:
    from oddsmodel.plan.write import DraftColumn
    from oddsmodel.records.survey import ColumnSurvey


def draft_command(records: Path, outcome: str, into: Path | None) -> int:
    """Write a starter plan to a new file, or to standard output."""
    from oddsmodel.plan.faults import fault
    from oddsmodel.plan.write import DraftRecords, draft_plan
    from oddsmodel.records.survey import survey

    if into is not None and (into.exists() or into.is_symlink()):
        raise InputFault(fault("draft-exists", plain(str(into))))
    found = survey(records)
    columns = {column.name: column for column in found.columns}
    if outcome not in columns:
        raise _no_such_outcome(outcome, list(columns))

    text = draft_plan(
        DraftRecords(
            source=_source(records, into),
            records=found.records,
            outcome=_drafted(columns[outcome]),
            columns=[_drafted(column) for column in found.columns],
            event=_event(columns[outcome]),
        )
    )
    if into is None:
        write_as_is(text)
        return DONE
    _write_new(into, text)
    tell(say("draft-written", file=str(into)))
    return DONE


def _no_such_outcome(outcome: str, columns: list[str]) -> InputFault:
    from oddsmodel.plan.faults import fault
    from oddsmodel.plan.nearest import nearest

    near = nearest(outcome, columns)
    return InputFault(
        fault("column-not-in-file", "--outcome", column=quoted(outcome), nearest="" if near is None else quoted(near))
    )


def _source(records: Path, into: Path | None) -> str:
    """The path of the records as the plan is to say it: relative to the plan where that can be."""
    if into is None:
        return str(records)
    try:
        return Path(os.path.relpath(records, into.parent)).as_posix()
    except ValueError:
        return str(records.absolute())


def _drafted(column: ColumnSurvey) -> DraftColumn:
    from oddsmodel.plan.write import DraftColumn

    return DraftColumn(
        name=column.name,
        kind=column.kind,
        levels=column.levels,
        different=column.different,
        not_recorded=column.not_recorded,
        suspected=column.suspected,
        questions=column.questions,
    )


def _event(outcome: ColumnSurvey) -> str | None:
    """The value that says yes, where the other says no; otherwise the analyst must say it."""
    from oddsmodel.records.same_value import is_yes_no_pair, yes_or_no

    values = [value for value, _ in outcome.levels]
    if outcome.different != len(values) or not is_yes_no_pair(values):
        return None
    return next(value for value in values if yes_or_no(value) == "yes")


def _write_new(path: Path, text: str) -> None:
    """Write a file that must not be there yet; nothing is left of it where that fails."""
    from oddsmodel.plan.faults import fault

    try:
        file = path.open("x", encoding="utf-8", newline="\n")
    except FileExistsError:
        raise InputFault(fault("draft-exists", plain(str(path)))) from None
    except (FileNotFoundError, NotADirectoryError):
        raise InputFault(fault("draft-no-folder", plain(str(path)))) from None
    try:
        with file:
            file.write(text)
    except BaseException:
        path.unlink(missing_ok=True)
        raise
