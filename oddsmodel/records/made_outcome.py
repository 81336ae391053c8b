"""The outcome that the plan makes, from dates or from a condition, as a column of its own."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from datetime import date

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
from oddsmodel.records.types import Column, LeftOut
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

Mask = NDArray[np.bool_]
LEVELS = ("no", "yes")
ROWS_NAMED = 5


@dataclass(frozen=True, slots=True)
class MadeOutcome:
    """The outcome as a coded column of "no" and "yes"; rows (n,) left out by reason; what is to be said."""

    coded: CodedColumn
    left_out: Mapping[str, LeftOut]
    findings: tuple[Finding, ...]


@dataclass(frozen=True, slots=True)
class Table:
    """Coded columns before they are records. counts (n,): true frequencies, or None; first_row: see `RawTable`.

    where: the place of a column in messages.
    """

    frame: pd.DataFrame
    columns: Mapping[str, Column]
    outside: Mapping[str, pd.Series]
    counts: pd.Series | None
    where: Callable[[str], str]
    first_row: int

    def records(self, rows: Mask) -> int:
        """How many records the rows (n,) stand for."""
        return int(rows.sum() if self.counts is None else self.counts.to_numpy(np.float64)[rows].sum())

    def days(self, name: str) -> Days:
        """A column of dates as days since 1970-01-01 (n,). Raises: InputFault as `parse_dates` does."""
        return parse_dates(self.frame[name], where=self.where(name), first_row=self.first_row)


def make_outcome(table: Table, outcome: Outcome) -> MadeOutcome:
    """The outcome from the plan's dates, or else from its condition.

    Raises: InputFault for a name that the records have already, dates that cannot be read or lie after extraction, a
        condition that does not fit the columns, and an outcome that is the same wherever it is known.
    """
    name = outcome.column_name
    if name in table.columns:
        raise InputFault(fault("outcome-name-taken", "the plan, [outcome] name", column=quoted(name)))
    left_out: dict[str, LeftOut] = {}
    findings: tuple[Finding, ...] = ()
    if outcome.event_when is not None:
        happened, decided = event_when(outcome.event_when, table.frame, table.columns, table.outside)
        event_free = decided & ~happened
    else:
        dates = _dates(outcome)
        follow_up = _follow_up(table, dates)
        window = within_window(follow_up, outcome.within_days or 0, outcome.from_day)
        happened, event_free = window.happened, window.event_free
        left_out = _left_out(window, table, dates, outcome.from_day)
        findings = _after_follow_up(events_after_follow_up(follow_up, window), table, dates)
    known = table.records(happened), table.records(event_free)
    if not all(known):
        raise InputFault(fault("made-outcome-one-value", "the plan, [outcome]", events=known[0], without=known[1]))
    codes = np.where(happened, 1, np.where(event_free, 0, -1)).astype(np.int8)
    values = pd.Series(pd.Categorical.from_codes(codes, categories=pd.Index(LEVELS)))
    column = Column(name, "yes-no", outcome.label or name, levels=LEVELS, reference=LEVELS[0])
    return MadeOutcome(CodedColumn(values, column), left_out, findings)


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


def _follow_up(table: Table, dates: _Dates) -> FollowUp:
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
            rows = [int(row) + table.first_row for row in late[:ROWS_NAMED]]
            facts = {"rows": rows, "total": int(late.size), "extracted": dates.extracted.isoformat()}
            faults.append(fault("date-after-extraction", table.where(name), **facts))
    if faults:
        raise InputFault(faults)
    followed = found[dates.followed_to] if dates.followed_to is not None else None
    return FollowUp(found[dates.start], found[dates.event], followed, float(extracted))


def _left_out(window: Window, table: Table, dates: _Dates, from_day: int) -> dict[str, LeftOut]:
    start, event = table.columns[dates.start].label, table.columns[dates.event].label
    return {
        "start-not-recorded": LeftOut(window.no_start, {"start": start}),
        "event-before-start": LeftOut(window.before_start, {"start": start, "event": event}),
        "window-not-finished": LeftOut(window.not_finished, {"extracted": dates.extracted.isoformat()}),
        "event-before-window": LeftOut(window.earlier, {"day": from_day}),
        "not-observed-to-window": LeftOut(window.not_observed, {"day": from_day}),
    }


def _after_follow_up(rows: Mask, table: Table, dates: _Dates) -> tuple[Finding, ...]:
    number = table.records(rows)
    if not number or dates.followed_to is None:
        return ()
    columns = {"event": dates.event, "followed_to": dates.followed_to}
    return (finding("caution", "events-after-follow-up", records=number, **columns),)
