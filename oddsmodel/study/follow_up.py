"""What an outcome from dates, and the choice of one record a person, add to a study's results."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from oddsmodel.measures.lost import Followed, lost_by_exposure, lost_findings
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.records.accounting import account
from oddsmodel.records.outcome import CodedOutcome
from oddsmodel.records.types import Records
from oddsmodel.results.study import ModelResult
from oddsmodel.study.prepare import Prepared, conditions
from oddsmodel.wording import say


def with_losses(
    result: ModelResult, prepared: Prepared, plan: StudyPlan, records: Records, outcome: CodedOutcome
) -> ModelResult:
    """The result with its losses to follow-up by exposure, where the outcome comes from dates and anybody was lost."""
    if plan.outcome.start is None:
        return result
    known = replace(outcome, recorded=np.ones_like(outcome.recorded))
    keep = conditions(plan, prepared.section)
    rows = account(records, known, keep=keep, exposures=(), adjustment=()).included
    lost = ~outcome.recorded[rows]
    if not lost.any():
        return result
    complete = account(records, known, keep=keep, exposures=prepared.exposures, adjustment=prepared.needed).included[
        rows
    ]
    counts = None if records.counts is None else records.counts.to_numpy(dtype=np.float64)[rows]
    followed = Followed(records.frame.loc[rows].reset_index(drop=True), lost, complete, counts)
    return replace(
        result,
        findings=(*result.findings, *lost_findings(followed)),
        tables=(*result.tables, lost_by_exposure(followed, records.columns, prepared.exposures)),
    )


def rules(plan: StudyPlan, records: Records) -> tuple[str, ...]:
    """How the outcome was made and which record of a person was used, a sentence or more each."""

    def label(name: str | None) -> str | None:
        return None if name is None else records.columns[name].label

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
