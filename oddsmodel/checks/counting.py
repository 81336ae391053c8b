"""Counting: how many of the records read the model rests on, and what share was left out."""

from __future__ import annotations

from oddsmodel.checks.severity import severity
from oddsmodel.model.fitted import FittedModel
from oddsmodel.records.accounting import NOT_OF_THE_STUDY
from oddsmodel.results.study import CheckResult, Flow, Verdict
from oddsmodel.wording import finding, say

WORTH_A_LOOK = 0.05
MANY = 0.20


def check(model: FittedModel, flow: Flow | None = None) -> CheckResult:
    """Share of the records that belong to the study which the model had to leave out.

    flow: the model's accounting, where there is one. Counts stand in the flow figure, not in the sentence.
    """
    share = None if flow is None else _share_left_out(flow)
    verdict: Verdict = "fine"
    if share is not None and share >= WORTH_A_LOOK:
        verdict = "look" if share < MANY else "caution"
    reason = say("counting-no-flow")
    return CheckResult(
        name="counting",
        family="counting",
        title=say("counting-title"),
        verdict=verdict,
        line=say("counting-line", analysed_records=model.records, share=share),
        statistics={"share_left_out": share},
        reasons={"share_left_out": reason} if share is None else {},
        findings=() if verdict == "fine" else (finding(severity(verdict), "counting-many-left-out", share=share),),
        explanation=say("counting-explanation"),
    )


def _share_left_out(flow: Flow) -> float | None:
    """Records left out for what is not recorded or not in the plan, of those that belong; None without counts."""
    counts = [exclusion.records for exclusion in flow.left_out]
    if flow.read is None or any(count is None for count in counts):
        return None
    others = sum(exclusion.records or 0 for exclusion in flow.left_out if exclusion.code in NOT_OF_THE_STUDY)
    belong = flow.read - others
    return (sum(count or 0 for count in counts) - others) / belong if belong > 0 else None
