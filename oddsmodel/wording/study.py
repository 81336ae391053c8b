"""Sentences of the study floor, by code."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, interval, ratio
from oddsmodel.wording.report_answer import one_sided
from oddsmodel.wording.say import Sentence
from oddsmodel.wording.study_models import SENTENCES as MODELS


def _flow(facts: Mapping[str, Any]) -> str:
    left = "; ".join(f"{count(number)} left out: {reason}" for reason, number in facts["left_out"])
    return f"Of {count(facts['read'])} records read, {count(facts['analysed'])} were analysed. {left}".strip()


def _estimates(facts: Mapping[str, Any]) -> str:
    told = [
        f"{label}, {series}: {one_sided(lower, upper) if estimate is None else ratio(estimate)}"
        + ("" if estimate is None else f" ({interval(lower, upper)})")
        for label, series, estimate, lower, upper in facts["marks"]
        if (estimate, lower, upper) != (None, None, None)
    ]
    words = f"Odds ratios with {facts['percent']:g}% intervals."
    return f"{words} {'; '.join(told)}." if told else f"{words} None can be shown."


SENTENCES: dict[str, Sentence] = {
    **MODELS,
    "no-records-left": (
        "No record is left to analyse: every one was left out. The accounting shows the reasons; look at `keep`, "
        "`not_recorded` and the levels in the plan."
    ),
    "one-outcome-only": (
        "Among the records analysed the outcome {which}, so there is nothing to compare. The accounting shows who "
        "was left out."
    ),
    "records-differ": (
        "“{model}” was fitted to its own complete records; the other models share the records that are complete "
        "for all of them. For {label} the odds ratio is {own} on its own records and {shared} on the shared ones."
    ),
    "few-digits": (
        "The numbers of this model are certain to about {digits} significant digits only, because its columns are "
        "nearly combinations of one another."
    ),
    "exposure-not-in-formula": "The exposure {exposure} is not a column of the formula.",
    "exposure-not-in-formula-remedy": lambda facts: (
        (f"Did you mean {facts['nearest']}? " if facts["nearest"] else "")
        + "An exposure is a column that the formula holds."
    ),
    "formula-not-text": "The formula is not a text.",
    "formula-not-text-remedy": 'Write the outcome, a tilde and the terms: "died ~ smoker + age".',
    "formula-names-no-outcome": "The formula names no outcome.",
    "formula-names-no-outcome-remedy": (
        'Write the outcome\'s column, a tilde and the terms: "died ~ smoker + age". A name with a space in it is '
        'written Q("the name").'
    ),
    "frame-not-a-frame": "The records are not a pandas data frame.",
    "frame-not-a-frame-remedy": "Give a data frame, such as pandas.DataFrame(records).",
    "frame-names-nested": "The names of the columns have several levels.",
    "frame-names-nested-remedy": "Give each column one name, as in frame.columns = [...].",
    "not-a-list-of-names": "A list of names is wanted.",
    "not-a-list-of-names-remedy": 'Write it in brackets, as in {key}=["{example}"].',
    "columns-not-sections": "Each column's settings are wanted under its name.",
    "columns-not-sections-remedy": 'Write them as in columns={{"age": {{"per": 10, "units": "years"}}}}.',
    "audience-unknown": "There is no audience {audience}.",
    "audience-unknown-remedy": 'Give audience="shareable" or audience="internal".',
    "internal-not-named": "An internal report shows small counts.",
    "internal-not-named-remedy": "Put INTERNAL in the file name.",
    "term-test-not-settled": "A model that this test compares did not settle.",
    "flow-title": "Who was counted: {model}",
    "flow-alt": _flow,
    "estimates-title": "Odds ratios of the exposure: {model}",
    "estimates-alt": _estimates,
    "plan-not-run": "The plan and the records hold together; nothing was fitted.",
}
