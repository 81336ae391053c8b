"""What an outcome from dates, and the choice of one record a person, add to a study's results."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from oddsmodel.measures.lost import lost_by_exposure, lost_findings
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.records.types import Column
from oddsmodel.results.study import ModelResult
from oddsmodel.study.data import StudyRecords
from oddsmodel.study.prepare import Prepared
from oddsmodel.wording import say


def with_losses(result: ModelResult, prepared: Prepared, plan: StudyPlan, data: StudyRecords) -> ModelResult:
    """The result with its losses to follow-up by exposure, where the outcome comes from dates and anybody was lost."""
    if plan.outcome.start is None:
        return result
    followed = data.followed(prepared, prepared.exposures[0])
    if not followed.lost.any():
        return result
    return replace(
        result,
        findings=(*result.findings, *lost_findings(followed)),
        tables=(
            *result.tables,
            lost_by_exposure(lambda name: data.followed(prepared, name), data.columns, prepared.exposures),
        ),
    )


def rules(plan: StudyPlan, columns: Mapping[str, Column]) -> tuple[str, ...]:
    """How the outcome was made and which record of a person was used, a sentence or more each."""

    def label(name: str | None) -> str | None:
        return None if name is None else columns[name].label

    told: list[str] = []
    repeats, outcome = plan.records.repeats, plan.outcome
    if repeats is not None:
        told.append(say("rule-repeats", person=label(repeats.of), order=label(repeats.ordered_by), use=repeats.use))
    if outcome.event_when is not None:
        told.append(say("rule-event-when", condition=outcome.event_when))
    if outcome.start is not None and outcome.extracted is not None:
        told.append(
            say(
                "rule-dates",
                start=label(outcome.start),
                event=label(outcome.event_date),
                followed_to=label(outcome.followed_to),
                within_days=outcome.within_days,
                from_day=outcome.from_day,
                extracted=outcome.extracted.isoformat(),
            )
        )
    return tuple(told)
