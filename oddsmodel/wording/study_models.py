"""Sentences on the models of a plan: what sets one apart, trends over ordered levels, levels against their average."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import decimal, listed
from oddsmodel.wording.report_answer import AVERAGE
from oddsmodel.wording.say import Sentence
from oddsmodel.wording.study_methods import METHOD_WORDS, prior_words


def _what_differs(facts: Mapping[str, Any]) -> str:
    parts = []
    if facts["formula"]:
        parts.append(f"formula {facts['formula']}")
    if facts["added"]:
        parts.append(f"with {listed(facts['added'])} added")
    if facts["taken"]:
        parts.append(f"without {listed(facts['taken'])}")
    if facts["exposures"]:
        parts.append(f"the exposure is {listed(facts['exposures'])}")
    if facts["keep"]:
        parts.append(f"only records with {facts['keep']}")
    if facts["percent"]:
        parts.append(f"{facts['percent']} intervals")
    if facts["method"] or facts["prior"]:
        way = METHOD_WORDS[facts["method"]] if facts["method"] else ""
        prior = prior_words(*facts["prior"]) if facts["prior"] else ""
        parts.append(f"by {way}" if way and not prior else f"with {prior}")
    if facts["base"] is None:
        return "; ".join(parts)
    return f"As “{facts['base']}”, {'; '.join(parts)}" if parts else f"The same as “{facts['base']}”"


def _role(facts: Mapping[str, Any]) -> str:
    role, planned = str(facts["role"]), facts["planned"]
    if planned is None:
        return role
    return f"{role}, {'planned' if planned else 'not planned'}"


def _adjusted_for(facts: Mapping[str, Any]) -> str:
    adjustment = facts["adjustment"]
    if not adjustment:
        return "Adjusted for nothing"
    if len(adjustment) > 4:
        return f"Adjusted for {len(adjustment)} columns"
    return f"Adjusted for {listed(adjustment)}"


def _trend_note(facts: Mapping[str, Any]) -> str:
    words = (
        f"The step is one unit of the scores ({facts['scores']}). The trend puts the scores as a number in place of "
        "the levels, with everything else as it is."
    )
    if facts["likelihood"]:
        words += (
            " The p-value of the step compares that with leaving the column out, the p-value of the departure compares "
            "the levels with the trend, both by the likelihood ratio."
        )
    if facts["reason"]:
        words += f" {facts['reason']}"
    if facts["adjustment"]:
        words += " This column was chosen to adjust the exposure, so its trend is no answer of its own."
    return words


def _standard_deviations(facts: Mapping[str, Any]) -> str:
    told = [f"{label}, {size}" for label, size in facts["deviations"]]
    return (
        f"Where an odds ratio is per standard deviation, that is the one among the records of “{facts['model']}” in "
        f"every model: {listed(told)}."
    )


def _deviation_size(facts: Mapping[str, Any]) -> str:
    value = float(f"{facts['value']:.3g}")
    digits = 0 if value == round(value) and value >= 100 else max(0, len(f"{value:g}".partition(".")[2]))
    return f"{decimal(value, digits)} {facts['units']}".strip()


SENTENCES: dict[str, Sentence] = {
    "what-differs": _what_differs,
    "model-role": _role,
    "model-role-said": lambda facts: f"{_role(facts).capitalize()}.",
    "model-adjusted-for": _adjusted_for,
    "compare-models-subgroups": (
        "The odds ratios of two subgroups also differ by chance. Whether they differ is judged by an interaction in "
        "one model, not by one interval holding 1 while the other does not."
    ),
    "compare-models-not-planned": (
        "What was not planned was thought of after something had been seen, and is weaker evidence for it."
    ),
    # Trends
    "trend-title": "{label}: trend over its levels",
    "trend-step-label": "{label}, per step of its scores",
    "trend-row-step": "Per step",
    "trend-row-departure": "Departure from the trend",
    "trend-note": _trend_note,
    "trend-not-plain-levels": (
        "{label} enters the model in another way than by levels against a reference, so its levels are not put in a "
        "trend."
    ),
    "trend-not-estimated": "The model with the trend could not be estimated ({status}).",
    "trend-two-levels": "With two levels there is nothing left to depart from the trend.",
    "trend-of-grouped-records": (
        "The records of a group are not independent, so there is no likelihood-ratio test; the p-value of the step is "
        "Wald's, which allows for the groups."
    ),
    "trend-not-settled": "A model that this test compares did not settle.",
    # Levels against their average
    "network-average": AVERAGE,
    "average-label": f"{{label}}: {{level}} against {AVERAGE}",
    "average-note": (
        "{label}: odds ratios are against the network average, which is the mean of the log odds over the {levels} "
        "levels, each counting the same whatever its size. The levels stand in the plan's order and are not ranked: "
        "with wide intervals a rank is mostly chance."
    ),
    "average-not-plain-levels": (
        "{label} enters the model in another way than by levels against a reference, so its levels are not compared "
        "with their average."
    ),
    # In the methods
    "methods-trends": (
        "Trends over ordered levels put the levels' scores as a number in place of the levels, and were tested by the "
        "likelihood ratio against leaving the column out, the levels against the trend likewise (after Cochran, 1954, "
        "and Armitage, 1955)."
    ),
    "methods-averages": (
        "Levels were compared with the unweighted mean of the log odds over all levels, each by a contrast with its "
        "own interval, and were not ranked."
    ),
    "methods-standard-deviations": _standard_deviations,
    "deviation-size": _deviation_size,
}
