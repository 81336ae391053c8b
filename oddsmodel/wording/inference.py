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
    kind = "every record is" if facts["complete"] else "some records are"
    shown = (
        "Where an odds ratio has no finite estimate none is shown, only the limit on the side where it has one."
        if facts["limits"]
        else "No odds ratio of this model is shown."
    )
    return (
        f"No finite estimate exists: {kind} predicted perfectly by the columns of this model (separation). "
        f"{' '.join(_pattern(facts))} So {'; '.join(told)}. {PROOFS[facts['proof']]} {shown} Join rare levels, or "
        "leave a column out, only for reasons that can be defended without looking at the outcome."
    )


PROOFS = {
    "exact": "This was proved by linear programming, and the proof checked in exact arithmetic.",
    "within rounding": (
        "This was found by linear programming; it holds where numbers that differ by no more than rounding are taken "
        "as equal."
    ),
    "too many columns": (
        "This was found by linear programming; with so many columns the proof was not checked in exact arithmetic."
    ),
    "too many steps": (
        "This was found by linear programming; checking the proof in exact arithmetic was broken off as too long."
    ),
}
"""How sure a separation is, by how far its proof was checked."""


def _pattern(facts: Mapping[str, Any]) -> list[str]:
    """Which records' pattern it is, as far as single columns tell it."""
    event, of_event = ("is a case", "is one") if facts["case_control"] else ("has the event", "has it")
    parts = []
    if facts["without"]:
        parts.append(f"None of the records with {_quoted(facts['without'])} {event}.")
    if facts["always"]:
        parts.append(f"Every record with {_quoted(facts['always'])} {event if not parts else of_event}.")
    for side in ("higher", "lower"):
        if facts[side]:
            who = "cases" if facts["case_control"] else "records with the event"
            parts.append(f"The values of {_quoted(facts[side])} are all {side} among {who} than among the others.")
    return parts or ["No column does so alone; several do together."]


def _quoted(labels: list[str]) -> str:
    named = [f"“{label}”" for label in labels]
    if len(named) > MOST_NAMED + 1:
        named = [*named[:MOST_NAMED], f"{len(labels) - MOST_NAMED} more"]
    return listed(named, "or")


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
