"""The outcome: exactly two values among recorded ones, and which of them is the event."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.errors import InputFault
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import Outcome
from oddsmodel.records.faults import fault, in_column
from oddsmodel.records.same_value import is_yes_no_pair, matching, same_value_key, yes_or_no
from oddsmodel.records.types import Records
from oddsmodel.wording.plain import as_code, quoted

VALUES_NAMED = 10


@dataclass(frozen=True, slots=True)
class CodedOutcome:
    """event (n,): whether the event is recorded; recorded (n,): whether either value is."""

    event: NDArray[np.bool_]
    recorded: NDArray[np.bool_]
    event_label: str
    other_label: str
    column: str


def code_outcome(records: Records, outcome: Outcome) -> CodedOutcome:
    """The outcome column as events.

    The event is the plan's, in any spelling of the same value; without one it is taken only between yes and no,
    true and false, or 1 and 0.

    Raises: InputFault when the column is not in the records, does not have exactly two values among recorded
        ones (the values and their counts are listed), or the event is none of them or left open.
    """
    column = outcome.column_name
    if column not in records.frame.columns:
        near = nearest(column, records.frame.columns)
        facts = {"column": quoted(column), "nearest": "" if near is None else quoted(near)}
        raise InputFault(fault("column-not-in-file", "the plan, [outcome] column", **facts))
    codes, values = _values(records.frame[column])
    weights = None if records.counts is None else records.counts.to_numpy(dtype=np.float64)
    met = np.bincount(codes[codes >= 0], None if weights is None else weights[codes >= 0], minlength=len(values))
    found = [(values[at], int(met[at])) for at in range(len(values)) if met[at] > 0]
    where = in_column(records.source, column)
    if len(found) != 2:
        found.sort(key=lambda value: -value[1])
        first = found[:VALUES_NAMED]
        raise InputFault(
            fault(
                "outcome-not-two-values",
                where,
                values=[quoted(value) for value, _ in first],
                with_records=[count for _, count in first],
                total=len(found),
            )
        )
    pair = (found[0][0], found[1][0])
    event = _event(pair, outcome)
    other = pair[1] if event == pair[0] else pair[0]
    return CodedOutcome(codes == values.index(event), codes >= 0, event, other, column)


def _values(series: pd.Series) -> tuple[NDArray[np.intp], list[str]]:
    """Each row's position (n,) among the different values, -1 where not recorded, and the values as texts."""
    if isinstance(series.dtype, pd.CategoricalDtype):
        return np.asarray(series.cat.codes, dtype=np.intp), [str(value) for value in series.cat.categories]
    codes, found = pd.factorize(series.to_numpy(), sort=True)
    return np.asarray(codes, dtype=np.intp), [same_value_key(value) for value in found]


def _event(pair: tuple[str, str], outcome: Outcome) -> str:
    values = [quoted(value) for value in pair]
    where = "the plan, [outcome] event"
    if outcome.event is None:
        if not is_yes_no_pair(pair):
            written = [as_code(value) for value in pair]
            raise InputFault(fault("event-left-open", where, values=values, written=written))
        return next(value for value in pair if yes_or_no(value) == "yes")
    event = matching(outcome.event, pair)
    if event is None:
        near = nearest(outcome.event, pair)
        raise InputFault(
            fault(
                "event-not-met",
                where,
                event=quoted(outcome.event),
                values=values,
                nearest="" if near is None else quoted(near),
            )
        )
    return event
