"""Sentences on cause and effect, and the cautions that every report carries."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import listed
from oddsmodel.wording.say import Sentence


def _quoted(labels: list[str]) -> str:
    return listed([f"“{label}”" for label in labels])


def _after(facts: Mapping[str, Any]) -> str:
    labels = facts["labels"]
    was = "was" if len(labels) == 1 else "were"
    it = "it" if len(labels) == 1 else "them"
    return (
        f"{_quoted(labels)} {was} measured after the exposure. Adjusting for {it} can remove part of what the exposure "
        f"does, or bring in an association that is not there. Fit a model without {it} and compare."
    )


def _unknown(facts: Mapping[str, Any]) -> str:
    labels = facts["labels"]
    was = "Was" if len(labels) == 1 else "Were"
    return (
        f"{was} {_quoted(labels)} measured before the exposure or after it? The plan does not say; write it there "
        "as “timing”."
    )


def _no_reason(facts: Mapping[str, Any]) -> str:
    return f"Why is {_quoted(facts['labels'])} adjusted for? The plan gives no reason; write it there as “why”."


def _not_measured(facts: Mapping[str, Any]) -> str:
    names = facts["names"]
    it, thing = ("it", "It is a") if len(names) == 1 else ("them", "They are")
    confounder = "confounder" if len(names) == 1 else "confounders"
    return (
        f"The plan names what nobody recorded: {listed(names)}. {thing} possible {confounder} that no adjustment here "
        f"can deal with; part or all of the association may be due to {it}."
    )


SENTENCES: dict[str, Sentence] = {
    "cause-trial": (
        "Allocation was by chance, so a difference between the arms can be put down to what was allocated, as far as "
        "allocation was concealed, the outcome was judged alike in all arms, and those lost or left out do not differ "
        "between them. Adjustment in a trial serves precision; it also changes which odds ratio is estimated."
    ),
    "cause-observed": (
        "The records cannot answer this by themselves. The odds ratio can be read as the effect of the exposure only "
        "if everything that drives both exposure and outcome was adjusted for and well measured, nothing adjusted for "
        "is itself changed by the exposure, and being among the records does not depend on both."
    ),
    "cause-cross-sectional": (
        "Exposure and outcome were recorded at the same time, so which came first cannot be told from these records."
    ),
    "cause-case-control": (
        "It matters besides that the controls stand for the people from whom the cases came, and that exposure was "
        "recorded alike for both."
    ),
    "cause-after": _after,
    "cause-unknown": _unknown,
    "cause-no-reason": _no_reason,
    "cause-not-measured": _not_measured,
    "cause-nothing-named": (
        "The plan names no confounder that was not recorded. There almost always is one: think again, and write it "
        "there as “not_measured”."
    ),
    "cause-no-adjustment": (
        "Nothing was adjusted for, so any common cause of exposure and outcome is still in the answer."
    ),
    "cause-no-adjustment-but-exposures": (
        "The exposures are adjusted for each other and for nothing else, so any other common cause of exposure and "
        "outcome is still in the answers."
    ),
    "cause-table": "What was adjusted for, and why",
    "cause-column": "Column",
    "cause-timing": "Measured",
    "cause-why": "Reason given in the plan",
    "timing-before exposure": "before the exposure",
    "timing-after exposure": "after the exposure",
    "timing-unknown": "not stated",
    "why-none": "none given",
    "questions-open": "Still to be answered",
    "caution-association": "Association is not causation: an odds ratio tells how exposure and outcome go together.",
    "caution-one-person": "Nothing here is for decisions about one person's care.",
    "caution-review": "Have the results reviewed by a qualified analyst before they are used.",
    "caution-rules": "Local data-protection, ethics and reporting rules come first.",
    "caution-not-measured": "Not recorded by anyone, and therefore not adjusted for: {names}.",
    "caution-odds-not-risk": (
        "An odds ratio is not a risk ratio: where the outcome is not rare, it lies further from 1 than the risk ratio."
    ),
}
