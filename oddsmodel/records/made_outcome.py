"""The outcome that the plan makes, from dates or from a condition, as a column of its own."""

from __future__ import annotations

from collections.abc import Callable, Container, Mapping
from dataclasses import dataclass, field
from datetime import date
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.schema import Outcome
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.dates import parse_dates
from oddsmodel.records.event_when import event_when
from oddsmodel.records.faults import fault
from oddsmodel.records.follow_up import Days, FollowUp, Window, events_after_follow_up, within_window
from oddsmodel.records.rows import Rows
from oddsmodel.records.types import Column, LeftOut
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

Mask = NDArray[np.bool_]
LEVELS = ("no", "yes")


@dataclass(frozen=True, slots=True)
class MadeOutcome:
    """The outcome as a coded column of "no" and "yes"; rows (n,) left out by reason; what is to be said."""

    coded: CodedColumn
    left_out: Mapping[str, LeftOut]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True)
class Table:
    """Coded columns before they are records. counts (n,): true frequencies, or None; rows: what they are called.

    where: the place of a column in messages. day_first: see `CodedColumn`, by column where it is known.
    """

    frame: pd.DataFrame
    columns: Mapping[str, Column]
    outside: Mapping[str, pd.Series]
    counts: pd.Series | None
    where: Callable[[str], str]
    rows: Rows
    day_first: Mapping[str, Mapping[str, bool]] = field(default_factory=dict)

    def rows_of(self, name: str) -> Rows:
        """The rows behind the values of a column."""
        return self.rows

    def records(self, rows: Mask) -> int:
        """How many records the rows (n,) stand for."""
        return int(rows.sum() if self.counts is None else self.counts.to_numpy(np.float64)[rows].sum())

    def days(self, name: str) -> Days:
        """A column of dates as days since 1970-01-01 (n,). Raises: InputFault as `parse_dates` does."""
        day_first = self.day_first.get(name)
        return parse_dates(self.frame[name], where=self.where(name), rows=self.rows, day_first=day_first)


def table_of(
    coded: Mapping[str, CodedColumn], counts: pd.Series | None, where: Callable[[str], str], rows: Rows
) -> Table:
    """Coded columns side by side."""
    return Table(
        frame=pd.DataFrame({name: column.values for name, column in coded.items()}, copy=False),
        columns={name: column.column for name, column in coded.items()},
        outside={name: pd.Series(column.outside) for name, column in coded.items() if column.outside is not None},
        counts=counts,
        where=where,
        rows=rows,
        day_first={name: column.day_first for name, column in coded.items() if column.day_first is not None},
    )


def make_outcome(table: Table, outcome: Outcome) -> MadeOutcome:
    """The outcome from the plan's dates, or else from its condition.

    Raises: InputFault for a name that the records have already, dates that cannot be read or lie after extraction, a
        condition that does not fit the columns, and an outcome that is the same wherever it is known.
    """
    refuse_taken_name(outcome, table.columns)
    found = outcome_by_row(table, outcome)
    known = table.records(found.happened), table.records(found.event_free)
    faults = faults_of_one_value(*known)
    if faults:
        raise InputFault(faults)
    findings = told_of_late_events(table.records(found.after_follow_up), outcome)
    return MadeOutcome(found.coded(outcome), found.left_out, findings)


def refuse_taken_name(outcome: Outcome, names: Container[str]) -> None:
    """InputFault where the records have a column that is called as the outcome that is to be made."""
    name = outcome.column_name
    if name in names:
        raise InputFault(fault("outcome-name-taken", "the plan, [outcome] name", column=quoted(name)))


def faults_of_one_value(events: int, without: int) -> list[Fault]:
    """The fault of an outcome that is the same wherever it is known, by its records with and without the event."""
    if events and without:
        return []
    return [fault("made-outcome-one-value", "the plan, [outcome]", events=events, without=without)]


@dataclass(frozen=True, slots=True)
class OutcomeByRow:
    """Rows (n,) where the event happened and where it did not; those left out by reason; events that happened after
    the end of follow-up."""

    happened: Mask
    event_free: Mask
    left_out: Mapping[str, LeftOut]
    after_follow_up: Mask

    def coded(self, outcome: Outcome) -> CodedColumn:
        """The outcome as a column of "no" and "yes"."""
        codes = np.where(self.happened, 1, np.where(self.event_free, 0, -1)).astype(np.int8)
        values = pd.Series(pd.Categorical.from_codes(codes, categories=pd.Index(LEVELS)))
        return CodedColumn(values, column_of_outcome(outcome))


def column_of_outcome(outcome: Outcome) -> Column:
    """What is known of an outcome that the plan makes."""
    name = outcome.column_name
    return Column(name, "yes-no", outcome.label or name, levels=LEVELS, reference=LEVELS[0])


def outcome_by_row(table: Table, outcome: Outcome) -> OutcomeByRow:
    """What the dates or the condition make of each row. Raises: InputFault as `make_outcome` does, whatever the rows
    come to together."""
    if outcome.event_when is not None:
        happened, decided = event_when(outcome.event_when, table.frame, table.columns, table.outside)
        return OutcomeByRow(happened, decided & ~happened, {}, np.zeros(happened.shape, dtype=np.bool_))
    follow_up = follow_up_of(table, outcome)
    window = within_window(follow_up, outcome.within_days or 0, outcome.from_day)
    left_out = _left_out(window, reasons_told(outcome, table.columns))
    return OutcomeByRow(window.happened, window.event_free, left_out, events_after_follow_up(follow_up, window))


@dataclass(frozen=True, slots=True)
class _Dates:
    """The columns of dates, and the day up to which they were looked for."""

    start: str
    event: str
    followed_to: str | None
    extracted: date


def _dates(outcome: Outcome) -> _Dates:
    if outcome.start is None or outcome.event_date is None or outcome.extracted is None:
        raise ValueError("an outcome from dates without all of its keys: the checks of the plan refuse it")
    return _Dates(outcome.start, outcome.event_date, outcome.followed_to, outcome.extracted)


def follow_up_of(table: Table, outcome: Outcome) -> FollowUp:
    """The plan's dates of each row.

    Raises: InputFault for dates that cannot be read, and for events and ends of follow-up after extraction.
    """
    dates = _dates(outcome)
    extracted = (dates.extracted - date(1970, 1, 1)).days
    found: dict[str, Days] = {}
    faults: list[Fault] = []
    for name in (dates.start, dates.event, dates.followed_to):
        if name is None:
            continue
        try:
            found[name] = table.days(name)
        except InputFault as unreadable:
            faults.extend(unreadable.faults)
            continue
        late = np.flatnonzero(found[name] > extracted) if name != dates.start else np.empty(0, dtype=np.intp)
        if late.size:
            rows = table.rows_of(name)
            facts = {"rows": rows.first(late)[0], "total": rows.total(late), "extracted": dates.extracted.isoformat()}
            faults.append(fault("date-after-extraction", table.where(name), **facts))
    if faults:
        raise InputFault(faults)
    followed = found[dates.followed_to] if dates.followed_to is not None else None
    return FollowUp(found[dates.start], found[dates.event], followed, float(extracted))


def reasons_told(outcome: Outcome, columns: Mapping[str, Column]) -> dict[str, dict[str, Any]]:
    """What the sentences of the reasons for which dates leave records out need, by reason."""
    if outcome.event_when is not None:
        return {}
    dates = _dates(outcome)
    start, event = columns[dates.start].label, columns[dates.event].label
    return {
        "start-not-recorded": {"start": start},
        "event-before-start": {"start": start, "event": event},
        "window-not-finished": {"extracted": dates.extracted.isoformat()},
        "event-before-window": {"day": outcome.from_day},
        "not-observed-to-window": {"day": outcome.from_day},
    }


def _left_out(window: Window, told: Mapping[str, Mapping[str, Any]]) -> dict[str, LeftOut]:
    rows = (window.no_start, window.before_start, window.not_finished, window.earlier, window.not_observed)
    return {code: LeftOut(mask, told[code]) for code, mask in zip(told, rows, strict=True)}


def told_of_late_events(number: int, outcome: Outcome) -> tuple[Finding, ...]:
    """What is said of records whose event came after the end of their follow-up."""
    if not number:
        return ()
    columns = {"event": outcome.event_date, "followed_to": outcome.followed_to}
    return (finding("caution", "events-after-follow-up", records=number, **columns),)
