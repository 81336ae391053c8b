"""Sentences on outcomes that the plan makes and on several records of a person, by code."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, listed, plural
from oddsmodel.wording.plain import plain, quoted
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]
LONGEST_LABEL = 60


def _rows(facts: Facts) -> str:
    rows = [str(row) for row in facts["rows"]]
    more = int(facts["total"]) - len(rows)
    if more > 0:
        rows.append(f"{count(more)} more")
    return f"{'row' if len(rows) == 1 else 'rows'} {listed(rows)}"


def _one_value(facts: Facts) -> str:
    events, without = int(facts["events"]), int(facts["without"])
    if not events and not without:
        return "The outcome is known of no record."
    which = "happened to none" if not events else "happened to each"
    return f"The event {which} of the records whose outcome is known ({count(events + without)})."


def _label(facts: Facts, key: str) -> str:
    return plain(facts[key], LONGEST_LABEL)


def _other(facts: Facts) -> str:
    return f"{'Earlier' if facts['use'] == 'last' else 'Later'} record of the same {_label(facts, 'person')}"


def _undecided(facts: Facts) -> str:
    return (
        f"Cannot be decided which record of the same {_label(facts, 'person')} is {facts['use']}: "
        f"{_label(facts, 'order')} not recorded"
    )


def _used(facts: Facts) -> str:
    return (
        f"Of several records of the same “{_label(facts, 'person')}” that belong to the study the {facts['use']} by "
        f"“{_label(facts, 'order')}” was used."
    )


def _window(facts: Facts) -> str:
    first, days = int(facts["from_day"]), int(facts["within_days"])
    start, event = (f"“{_label(facts, key)}”" for key in ("start", "event"))
    words = f"The outcome is whether {event} lies within {plural(days, 'day')} of {start}, that day included."
    if first:
        words = (
            f"The outcome is whether {event} lies within {plural(days, 'day')} of day {first} after {start}, that day "
            f"included; records with the event before it, or not observed until it, were left out."
        )
    words += (
        f" Records whose window could not have finished by extraction ({facts['extracted']}) were left out, whether "
        f"or not they have the event: to count late entrants as event-free, or to keep only those of them with the "
        f"event, would bias the odds ratio."
    )
    if facts["followed_to"] is None:
        return f"{words} Everybody is taken to have been followed until extraction."
    return (
        f"{words} Where there is no event and follow-up (“{_label(facts, 'followed_to')}”) ends before the window, "
        f"the outcome is not recorded."
    )


FOLLOW_UP: dict[str, Sentence] = {
    "left-out-person-not-recorded": lambda facts: f"Not recorded whose record it is: {_label(facts, 'person')}",
    "left-out-repeat-undecided": _undecided,
    "left-out-repeat": _other,
    "left-out-start-not-recorded": lambda facts: f"Start not recorded: {_label(facts, 'start')}",
    "left-out-event-before-start": lambda facts: (
        f"Event before start: {_label(facts, 'event')} is earlier than {_label(facts, 'start')}"
    ),
    "left-out-window-not-finished": "Window not finished by extraction ({extracted})",
    "left-out-event-before-window": "Event before day {day}",
    "left-out-not-observed-to-window": "Not observed until day {day}",
    "events-after-follow-up": lambda facts: (
        f"{plural(facts['records'], 'event')} in {quoted(facts['event'])} came after the end of follow-up in "
        f"{quoted(facts['followed_to'])} and {'is' if facts['records'] == 1 else 'are'} counted. If others would not "
        f"have been seen after that date, such events are seen more readily than their absence, which biases the odds "
        f"ratio: name as followed_to until when events were looked for."
    ),
    "repeats-alike": lambda facts: (
        f"{plural(facts['records'], 'record')} {'has' if facts['records'] == 1 else 'have'} the same place in the "
        f"order by {quoted(facts['order'])} as another of the same {_label(facts, 'person')}, and the same values in "
        f"all columns of the plan; the first in the file was used."
    ),
    "rule-dates": _window,
    "rule-event-when": lambda facts: (
        f"The outcome is that {plain(facts['condition'], 300)}. Where a part of this was not recorded it was decided "
        f"by the other parts if these suffice; else the outcome is not recorded."
    ),
    "rule-repeats": _used,
}

FOLLOW_UP_FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "outcome-name-taken": (
        "The outcome that the plan makes is called {column}, and so is a column of the records.",
        'Give the outcome a name of its own under [outcome], such as name = "died_within_year".',
    ),
    "date-after-extraction": (
        lambda facts: f"A date is later than the extraction ({facts['extracted']}): {_rows(facts)}.",
        "Correct the dates, or name the day up to which dates were looked for as extracted under [outcome].",
    ),
    "made-outcome-one-value": (
        _one_value,
        "Look at the dates, the window or the condition under [outcome], and at the accounting's reasons.",
    ),
    "order-not-readable": (
        "{column} puts each person's records in order, and holds neither dates nor numbers.",
        'Name a column of dates or numbers as ordered_by, and say kind = "date" or kind = "number" in its section.',
    ),
    "repeats-tied": (
        lambda facts: (
            f"For {plural(facts['persons'], 'value')} of {quoted(facts['person'])} it cannot be told which record is "
            f"{facts['use']}: several share that place in the order, and differ otherwise. See {_rows(facts)}."
        ),
        "Order by a column that tells them apart (a time or a running number), or take out the records that do not "
        "belong.",
    ),
}
