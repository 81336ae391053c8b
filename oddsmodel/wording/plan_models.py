"""Sentences on models that build upon others, trends and averages; under `<code>-remedy` what to do."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import listed
from oddsmodel.wording.say import Sentence

LONGEST_LIST = 12


def _choose(facts: Mapping[str, Any]) -> str:
    """ "Did you mean ...?" where one is near, and what there is to choose from."""
    meant = f"Did you mean {facts['nearest']}? " if facts["nearest"] else ""
    valid = list(facts["valid"])
    if not valid:
        return f"{meant}{facts['otherwise']}"
    shown = [*valid[:LONGEST_LIST], "others"] if len(valid) > LONGEST_LIST else valid
    return f"{meant}Choose from {listed(shown, 'or')}."


FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "based-on-unknown": ("There is no model called {base} to build upon.", _choose),
    "based-on-itself": ("The model builds upon itself.", "Name an earlier model, or give this one its own formula."),
    "based-on-circle": (
        "These models build upon one another in a circle: {names}.",
        "Give one of them its own formula and exposures, and take its based_on out.",
    ),
    "based-on-later": (
        "{base} stands further down in the plan.",
        "Move this model below {base}: a model builds upon an earlier one.",
    ),
    "changes-without-base": (
        "{key} changes the formula of another model, and this model names none.",
        'Add a line such as based_on = "main", or write the terms in the formula.',
    ),
    "changes-beside-formula": (
        "{key} changes the base's formula, but this model has a formula of its own.",
        "Take out either the formula or {key}.",
    ),
    "change-repeated": ("{term} is listed twice.", "List it once."),
    "role-of-the-first": (
        "The first model is the one that answers the question, so it has no other role.",
        "Take the line out, or put another model first.",
    ),
    "log-f-without-prior": (
        "The method log-F needs a prior: how strong it is, and for which columns.",
        'Add a line such as prior = {{m = 2, columns = ["smoker"]}}.',
    ),
    "prior-without-log-f": (
        "A prior is used by the method log-F alone.",
        'Add method = "log-F", or take the prior out.',
    ),
    "prior-of-no-column": (
        "The prior names no column.",
        'List the columns whose odds ratios it is for, such as columns = ["smoker"].',
    ),
    "prior-not-in-formula": ("The prior names {column}, which is not in the formula.", _choose),
    "prior-no-odds-ratio": (
        "{column} has no odds ratio of its own in this model, so a prior cannot be stated for it.",
        "Take it out of the prior: a column in a spline, a power or a product has none.",
    ),
    "method-of-grouped-records": (
        "Records that belong to groups have no likelihood, and this method needs one.",
        "Take the method out of the model, or grouped_by out of [records].",
    ),
    "method-needs-memory": (
        "This method needs the records in memory, and they do not fit into the memory that the run may use.",
        "Raise [run] memory if the machine has more; so many records hardly need it.",
    ),
    "method-needs-one-machine": (
        "This method needs all records in one place, and the run has them on workers.",
        "Run the plan without workers, or take the method out of the model; so many records hardly need it.",
    ),
    "trend-repeated": ("{column} is listed twice.", "List it once."),
    "scores-not-rising": (
        "Scores must be finite numbers that rise from level to level.",
        "List one for each level, the lowest first, such as scores = [0, 1, 2].",
    ),
    "scores-number": (
        "There are {scores} scores for {levels} levels.",
        "List one score for each level, in the order of the levels.",
    ),
    "scores-kind": (
        "Scores belong to the levels of an ordered column, and this one is of the kind “{kind}”.",
        'Take the line out, or write kind = "ordered" and list the levels from the lowest.',
    ),
    "average-kind": (
        "The levels of a category can be compared with their average, and this column is of the kind “{kind}”.",
        'Take the line out, or write kind = "category".',
    ),
    "average-not-an-exposure": (
        "No model has {column} among its exposures, so there is nothing to compare with the average.",
        "Take the line out, or name the column among a model's exposures.",
    ),
    # Against the formula and the records.
    "add-already-there": (
        "The base's formula already holds {term}.",
        "Take it out of add.",
    ),
    "add-nothing": ("{term} is no term of a formula.", 'Name a term, such as "ward".'),
    "change-of-the-intercept": (
        "{term} says something of the intercept, which the base's formula settles.",
        "Leave 0, 1 and - 1 out, or give the model its own formula.",
    ),
    "leave-out-not-there": ("The base's formula does not hold {term}.", _choose),
    "leave-out-within-product": (
        "{term} stands in {product} as well, which would be left without it.",
        "Leave both out, or neither.",
    ),
    "trend-not-in-formula": ("The trend column {column} is not a column of the formula.", _choose),
    "trend-not-ordered": (
        "A trend needs an ordered column, and {column} is of the kind “{kind}”.",
        'Write kind = "ordered" in its section and list its levels from the lowest.',
    ),
}

SENTENCES: dict[str, Sentence] = {code: what for code, (what, _) in FAULTS.items()} | {
    f"{code}-remedy": remedy for code, (_, remedy) in FAULTS.items()
}
