"""What a plan states, as plain values for results.json: without prose, which may say anything of anybody."""

from __future__ import annotations

from typing import Any

from oddsmodel.plan.schema import StudyPlan

LEFT_OUT = {
    "study": ("title", "question"),
    "records": ("source", "query"),
}
"""The title and the question stand elsewhere; where the records came from may tell a machine or a person."""
PROSE = ("why",)


def plan_facts(plan: StudyPlan) -> dict[str, Any]:
    """The values of a plan by section and key, but for those that are as they would be if the plan said nothing.

    Comments are no part of them, nor are reasons (`why`), where the records are, or the query that selects them: a
    plan is written by and for people inside, results may leave.
    """
    facts: dict[str, Any] = plan.model_dump(mode="json", exclude_defaults=True, by_alias=True)
    for section, keys in LEFT_OUT.items():
        for key in keys:
            facts.get(section, {}).pop(key, None)
    told: dict[str, Any] = _without_prose(facts)
    return {section: content for section, content in told.items() if content}


def _without_prose(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _without_prose(one) for key, one in value.items() if key not in PROSE}
    return [_without_prose(one) for one in value] if isinstance(value, list) else value
