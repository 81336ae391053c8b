"""Sentences of the inference floor, by code."""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from typing import Any

from oddsmodel.wording.numbers import listed
from oddsmodel.wording.say import Sentence

MOST_NAMED = 8


def _weight(weight: float) -> str:
    fraction = Fraction(weight).limit_denominator(12)
    if abs(float(fraction) - weight) < 1e-9 * max(1.0, abs(weight)):
        return str(fraction)
    return f"{weight:.6g}"


def relation(column: str, parts: list[list[Any]]) -> str:
    """ "C = A + 2 × B" from a column's label and its parts [weight, label]."""
    if not parts:
        return f"“{column}” is zero for every record"
    words = ""
    for weight, label in parts:
        sign = "\u2212" if weight < 0 else "+"
        size = _weight(abs(float(weight)))
        piece = f"“{label}”" if size == "1" else f"{size} × “{label}”"
        words += (f" {sign} " if words else ("\u2212" if weight < 0 else "")) + piece
    return f"“{column}” = {words}"


def _aliased(facts: Mapping[str, Any]) -> str:
    told = [relation(str(column), parts) for column, parts in facts["relations"]]
    return (
        "This model has no unique answer, because some columns of it are exact combinations of others: "
        f"{'; '.join(told)}. Leave one of the columns concerned out of the formula, or join levels that "
        "always go together. Nothing was dropped on its own."
    )


def _named(labels: list[str]) -> str:
    """The labels in a list; of very many the first, with the number of the others."""
    if len(labels) <= MOST_NAMED + 1:
        return listed(labels)
    return listed([*labels[:MOST_NAMED], f"{len(labels) - MOST_NAMED} more"])


def _separated(facts: Mapping[str, Any]) -> str:
    told = []
    if facts["rising"]:
        told.append(f"the odds ratio of {_named(facts['rising'])} rises without end")
    if facts["falling"]:
        told.append(f"the odds ratio of {_named(facts['falling'])} falls to zero")
    if facts["undetermined"]:
        told.append(f"the records do not settle which way {_named(facts['undetermined'])} would go")
    kind = "Every record is" if facts["complete"] else "Some records are"
    return (
        f"No finite estimate exists. {kind} predicted perfectly by the columns of this model (separation), so that "
        f"{'; '.join(told)}. Where an odds ratio has no finite estimate none is shown, only the limit on the side "
        "where it has one. Join rare levels, or leave the column out, for reasons that can be defended without "
        "looking at the outcome."
    )


SENTENCES: dict[str, Sentence] = {
    "aliased": _aliased,
    "separated": _separated,
    "not-converged": (
        "The search for the maximum of the likelihood did not settle after {steps} steps, so no estimate is shown. "
        "Columns of very different size or a nearly empty level are the usual cause."
    ),
    "more-parameters-than-records": (
        "The model has {parameters} coefficients, more than there are different kinds of record ({patterns}), so it "
        "cannot be estimated. Leave terms out of the formula."
    ),
}
