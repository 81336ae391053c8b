"""Sentences on dates, renamed and derived columns, by code: faults as (sentence, remedy), and findings."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import listed, plural
from oddsmodel.wording.plain import plain, quoted
from oddsmodel.wording.records_faults import with_counts
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]


def _with_rows(facts: Facts) -> str:
    """ "row 3 has "x"", "row 3 has "x", row 8 has "y" and 120 more rows"."""
    parts = [f"row {row} has {value}" for row, value in zip(facts["rows"], facts["values"], strict=True)]
    more = int(facts["total"]) - len(parts)
    if more > 0:
        parts.append(f"{plural(more, 'more row')} {'is' if more == 1 else 'are'} alike")
    return listed(parts)


ISO = "Write the dates as year-month-day, such as 2024-03-14"

DATE_FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "date-not-readable": (
        lambda facts: f"This is a column of dates, but {_with_rows(facts)}.",
        f"{ISO}; where a text means “not recorded”, add it to the column's not_recorded in the plan.",
    ),
    "date-two-digit-year": (
        lambda facts: f"A date has a year of two digits, so its century is not told: {_with_rows(facts)}.",
        f"{ISO}.",
    ),
    "date-not-in-calendar": (
        lambda facts: f"The calendar does not have this date: {_with_rows(facts)}.",
        "Correct it; where it means “not recorded”, add it to the column's not_recorded in the plan.",
    ),
    "date-far-off": (
        lambda facts: f"A date is before {facts['least']} or after {facts['most']}: {_with_rows(facts)}.",
        "Correct it; where it means “not recorded”, add it to the column's not_recorded in the plan.",
    ),
    "date-order-ambiguous": (
        lambda facts: (
            f"It cannot be told whether day or month comes first, since no number above 12 settles it: "
            f"{_with_rows(facts)}."
        ),
        f"{ISO}.",
    ),
    "date-orders-differ": (
        lambda facts: (
            f"Some dates have the day first ({facts['examples'][0]}) and some the month ({facts['examples'][1]}), "
            f"so the others cannot be told: {_with_rows(facts)}."
        ),
        f"{ISO}, all of them.",
    ),
}


def _meant(facts: Facts) -> str:
    pairs = zip(facts["values"], facts["nearest"], strict=True)
    meant = [f"{value} may be meant for {near}" for value, near in pairs if near]
    return f"{listed(meant)}. " if meant else ""


def _not_yes_no(facts: Facts) -> str:
    more = f" and {plural(facts['more'], 'other value')}" if facts["more"] else ""
    return f"{facts['column']} counts points where {facts['part']} is yes, but it also holds {facts['values']}{more}."


DERIVED_FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "derived-needs-number": (
        "{source} is of the kind {kind}, and only a number can be cut into such groups.",
        'If it holds numbers, say kind = "number" in its section; levels are put together by groups_of.',
    ),
    "derived-needs-date": (
        "{source} is of the kind {kind}, and years lie between dates.",
        'If it holds dates, say kind = "date" in its section.',
    ),
    "derived-needs-yes-no": (
        _not_yes_no,
        "Put what means “not recorded” into the column's not_recorded; or make yes and no of its levels by groups_of "
        "in a derived column, and give the points to that.",
    ),
    "derived-level-unmapped": (
        lambda facts: f"No group has {with_counts(facts)} of {facts['source']}.",
        lambda facts: (
            f"{_meant(facts)}Put each level into a group, correct the file, or leave these records out with "
            f'other_levels = "exclude and count".'
        ),
    ),
    "derived-no-cut-point": (
        "{source} has too few different values among the records kept to be cut into {groups} groups.",
        "Ask for fewer groups, or give edges by bands_of.",
    ),
    "derived-name-taken": (
        "The file has a column {column} of its own.",
        "Give the derived column another name, such as {column} with an ending.",
    ),
    "renamed-name-taken": (
        "The file has a column {column} besides {file_name}, which the plan calls so.",
        "Choose another name in the plan for {file_name}.",
    ),
}

DERIVED_WORDS: dict[str, Sentence] = {
    "derived-heading-label": "Derived column",
    "derived-heading-records": "Records",
    "derived-level-of": lambda facts: f"Level of {plain(facts['label'], 60)}",
    "derived-part": lambda facts: f"Of these, {plain(facts['label'], 60)}",
    "derived-smallest": lambda facts: f"Smallest {plain(facts['label'], 60)}",
    "derived-largest": lambda facts: f"Largest {plain(facts['label'], 60)}",
    "derived-earliest": lambda facts: f"Earliest {plain(facts['label'], 60)}",
    "derived-latest": lambda facts: f"Latest {plain(facts['label'], 60)}",
    "derived-years": "value",
    "derived-dates": "calendar year",
    "derived-recorded": "recorded",
    "derived-not-recorded": "not recorded",
    "derived-in-no-group": "in no group",
    "derived-title": lambda facts: f"{plain(facts['label'], 60)}, counted beside what it was made from",
    "derived-note": lambda facts: (
        f"{facts['told']} Counted among the records analysed"
        f"{'; a report to be shared has smallest and largest values rounded outwards' if facts['ends'] else ''}."
    ),
    "fold-derived": lambda facts: f"How {listed([plain(label, 60) for label in facts['labels']])} came about",
    "derived-other-levels": "other levels",
    "derived-rule-bands_of": lambda facts: f"Bands of {plain(facts['sources'][0], 60)}; a band holds its lower edge.",
    "derived-rule-years_between": lambda facts: (
        f"Years from {plain(facts['sources'][0], 60)} to {plain(facts['sources'][1], 60)}: days divided by 365.25."
    ),
    "derived-rule-points": lambda facts: (
        f"Points for {listed([plain(label, 60) for label in facts['sources']])}, summed; a part that is not recorded "
        f"{'counts as no' if facts['zero'] else 'leaves the sum not recorded'}."
    ),
    "derived-rule-groups_of": lambda facts: f"Groups of the levels of {plain(facts['sources'][0], 60)}.",
    "derived-rule-quantile_groups_of": lambda facts: (
        f"Groups of about equal size by the quantiles of {plain(facts['sources'][0], 60)} among the records that the "
        f"plan keeps; a group holds its lower cut point."
    ),
    "columns-renamed": lambda facts: (
        "Columns are called otherwise than in the file: "
        + listed(
            [f"{quoted(b)} in the file is {quoted(a)}" for a, b in zip(facts["columns"], facts["file"], strict=True)]
        )
        + "."
    ),
    "implausible-values": lambda facts: (
        f"{quoted(facts['column'])}: a value below {facts['limits'][0]:g} or above {facts['limits'][1]:g} is not "
        f"plausible and was taken as not recorded, in {plural(facts['records'], 'record')}."
    ),
    "years-negative": lambda facts: (
        f"{quoted(facts['column'])} is below 0 in {plural(facts['records'], 'record')}: {quoted(facts['second'])} is "
        f"before {quoted(facts['first'])} there. Correct the dates, or set such values aside with plausible."
    ),
    "quantile-cuts": lambda facts: (
        f"{quoted(facts['source'])} was cut at {listed(facts['cuts'])} to make {quoted(facts['column'])}, by its "
        f"quantiles among the records that the plan keeps."
    ),
    "quantile-fewer-groups": lambda facts: (
        f"{quoted(facts['column'])} has {facts['groups']} groups and not the {facts['asked']} asked for: so many "
        f"records have the same value of {quoted(facts['source'])} that cut points fall together."
    ),
}
