"""What is wrong with the keys of an outcome, or of repeats, and what to do: (sentence, remedy) by code."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import listed
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]


def _examples(facts: Facts) -> str:
    return f"Add {listed(list(facts['examples']))}."


OUTCOME_FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "outcome-ways-mixed": (
        lambda facts: f"The outcome is given in more than one way: {listed(list(facts['ways']))}.",
        "Keep one: column, or event_when, or start with the other keys of an outcome from dates.",
    ),
    "outcome-dates-incomplete": (
        lambda facts: f"An outcome from dates also needs {listed(list(facts['missing']))}.",
        _examples,
    ),
    "outcome-key-without": ("{key} has a meaning only beside {needs}.", "Take it out, or add {needs}."),
    "outcome-dates-same": (
        "One column is named for two of start, event_date and followed_to.",
        "Name a column of its own for each; leave followed_to out where everybody is followed until extracted.",
    ),
    "outcome-date-kind": (
        "The outcome is made from {column}, so it holds dates.",
        'Take the line out, or write kind = "date".',
    ),
    "not-a-day": ("{found} is not a date.", "Write year, month and day, such as extracted = 2025-03-31."),
    "repeats-same-column": (
        "{column} is named both for the person and for the order.",
        "Name under ordered_by the date or number that puts a person's records in order.",
    ),
    "repeats-beside-count": (
        "Rows that each count several records cannot be told apart by person.",
        "Take out either count or repeats.",
    ),
    "repeats-by-the-outcome": (
        "{column} is the outcome: which record is used must not depend on what happened.",
        "Name another column.",
    ),
    "repeats-order-kind": (
        "{column} puts each person's records in order, so it holds dates or numbers.",
        'Take the line out, or write kind = "date" or kind = "number".',
    ),
}
