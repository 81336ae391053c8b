"""What must hold between the keys of the outcome, and between those of repeats, before any record is read."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from typing import Any

from oddsmodel.errors import Fault
from oddsmodel.plan.examples import example
from oddsmodel.plan.faults import fault
from oddsmodel.plan.schema import ColumnSection, Outcome, RecordsSection
from oddsmodel.wording.plain import quoted

At = Callable[..., str]
WAYS = ("column", "event_when", "start")
DATES = ("start", "event_date", "within_days", "extracted")
"""The keys that an outcome from dates cannot do without."""
OF_A_WAY = {
    "event": "column",
    "name": "event_when or start",
    "event_date": "start",
    "followed_to": "start",
    "within_days": "start",
    "from_day": "start",
    "extracted": "start",
}
"""A key of the outcome → the key without which it has no meaning."""


def check_outcome(outcome: Outcome, written: Any, columns: Mapping[str, ColumnSection], at: At) -> Iterator[Fault]:
    """One way to make the outcome, with all of its keys. `written`: the section as the plan has it."""
    keys = set(written) if isinstance(written, Mapping) else set()
    ways = [key for key in WAYS if key in keys]
    if not ways and not keys & set(DATES):
        yield fault("key-missing", at("outcome"), key="column", example=example(("outcome", "column")))
        return
    if len(ways) > 1:
        yield fault("outcome-ways-mixed", at("outcome"), ways=ways)
        return
    if ways in ([], ["start"]):
        missing = [key for key in DATES if key not in keys]
        if missing:
            examples = [example(("outcome", key)) for key in missing]
            yield fault("outcome-dates-incomplete", at("outcome"), missing=missing, examples=examples)
    way = ways[0] if ways else "start"
    for key, needs in OF_A_WAY.items():
        if key in keys and way not in needs.split(" or "):
            yield fault("outcome-key-without", at("outcome", key), key=key, needs=needs)
    yield from _dates(outcome, columns, at)


def _dates(outcome: Outcome, columns: Mapping[str, ColumnSection], at: At) -> Iterator[Fault]:
    if len(set(outcome.dates)) < len(outcome.dates):
        yield fault("outcome-dates-same", at("outcome"))
    for name in dict.fromkeys(outcome.dates):
        if name in columns and columns[name].kind not in (None, "date"):
            yield fault("outcome-date-kind", at("columns", name, "kind"), column=quoted(name))


def check_repeats(
    records: RecordsSection, outcome: Outcome | None, columns: Mapping[str, ColumnSection], at: At
) -> Iterator[Fault]:
    """A person and an order that are not the same column; rows that stand for one record each."""
    repeats = records.repeats
    if repeats is None:
        return
    if repeats.of == repeats.ordered_by:
        yield fault("repeats-same-column", at("records", "repeats"), column=quoted(repeats.of))
    if records.count is not None:
        yield fault("repeats-beside-count", at("records", "repeats"))
    if outcome is not None and outcome.column in (repeats.of, repeats.ordered_by):
        yield fault("repeats-by-the-outcome", at("records", "repeats"), column=quoted(outcome.column or ""))
    order = columns.get(repeats.ordered_by)
    if order is not None and order.kind not in (None, "number", "date"):
        yield fault("repeats-order-kind", at("columns", repeats.ordered_by, "kind"), column=quoted(repeats.ordered_by))
