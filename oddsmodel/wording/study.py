"""Sentences of the study floor, by code."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, interval, ratio
from oddsmodel.wording.say import Sentence


def _flow(facts: Mapping[str, Any]) -> str:
    left = "; ".join(f"{count(number)} left out: {reason}" for reason, number in facts["left_out"])
    return f"Of {count(facts['read'])} records read, {count(facts['analysed'])} were analysed. {left}".strip()


def _estimates(facts: Mapping[str, Any]) -> str:
    told = [
        f"{label}, {series}: {ratio(estimate)} ({interval(lower, upper)})"
        for label, series, estimate, lower, upper in facts["marks"]
        if estimate is not None
    ]
    return f"Odds ratios with {facts['percent']:g}% intervals. {'; '.join(told)}."


SENTENCES: dict[str, Sentence] = {
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
    "flow-title": "Who was counted: {model}",
    "flow-alt": _flow,
    "estimates-title": "Odds ratios of the exposure: {model}",
    "estimates-alt": _estimates,
    "plan-not-run": "The plan and the records hold together; nothing was fitted.",
}
