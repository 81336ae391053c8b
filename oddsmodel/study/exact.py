"""Exact conditional estimates of the exposure's coefficients."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from oddsmodel.findings import Finding
from oddsmodel.inference import BeyondBudget, Budget, ExactInference, ManyValuedColumn, exact_inference
from oddsmodel.measures.crude import Crude
from oddsmodel.measures.scale import exponential
from oddsmodel.model.fitted import FittedModel
from oddsmodel.progress import Progress
from oddsmodel.results.study import CoefficientResult, ExactResult, ProfileResult, WaldResult
from oddsmodel.wording import finding, say

BUDGET = Budget(seconds=None, work=5_000_000_000)
"""About a minute for each odds ratio, without a clock: whether there is an answer depends on the records alone."""

NUMBERS = ("log_odds_ratio", "standard_error", "odds_ratio", "wald", "profile")


@dataclass(frozen=True)
class ExactEstimates:
    """coefficients of the model in the order of its matrix; refused: why there are none, where that is so."""

    coefficients: tuple[CoefficientResult, ...]
    refused: Finding | None


def exact_coefficients(model: FittedModel, crude: Mapping[int, Crude], progress: Progress) -> ExactEstimates:
    """The exposure's coefficients by exact conditional inference; all others are conditioned upon and have no number.

    Refused beyond the budget, and where a column has so many values that nothing can be said.
    """
    X, events, trials = model.binomial.rows_apart()
    found: list[CoefficientResult] = []
    for position, column in enumerate(model.design.columns):
        of_its_own = crude.get(position)
        reasons = dict(of_its_own.reasons) if of_its_own else {}
        answer: ExactInference | None = None
        if column.role == "exposure" and column.shown:
            try:
                answer = exact_inference(
                    X, events, trials, position, level=model.level, budget=BUDGET, progress=progress
                )
            except BeyondBudget as beyond:
                return ExactEstimates((), _refused(beyond))
            except ManyValuedColumn as many:
                label = model.design.columns[many.column].label
                return ExactEstimates((), finding("stop", "exact-many-values", label=label))
        reasons |= dict.fromkeys(("standard_error", "wald", "profile"), say("exact-has-its-own-limits"))
        if answer is None:
            code = "exact-conditioned-upon" if column.role != "exposure" else "column-without-own-odds-ratio"
            reasons |= dict.fromkeys(NUMBERS, say(code, term=column.term))
        estimate = None if answer is None or answer.estimate is None else answer.estimate * column.per
        if answer is not None and estimate is None:
            reasons |= dict.fromkeys(("log_odds_ratio", "odds_ratio"), say(f"exact-{answer.status.replace(' ', '-')}"))
        found.append(
            CoefficientResult(
                term=column.term,
                level=column.level,
                reference=column.reference,
                levels=column.levels,
                role=column.role,
                label=column.label,
                log_odds_ratio=estimate,
                standard_error=None,
                odds_ratio=None if estimate is None else exponential(estimate),
                wald=WaldResult(None, None, None),
                profile=ProfileResult(None, None),
                shown=column.shown,
                crude=of_its_own.same if of_its_own else None,
                crude_all_records=of_its_own.all_records if of_its_own else None,
                reasons=reasons,
                exact=None if answer is None else _exact(answer, column.per),
            )
        )
    return ExactEstimates(tuple(found), None)


def _exact(answer: ExactInference, per: float) -> ExactResult:
    def on_ratio_scale(value: float | None) -> float | None:
        return None if value is None else exponential(value * per)

    ends = (answer.lower, answer.upper, answer.mid_p_lower, answer.mid_p_upper)
    lower, upper, mid_lower, mid_upper = (on_ratio_scale(end) for end in ends)
    if per < 0.0:
        lower, upper, mid_lower, mid_upper = upper, lower, mid_upper, mid_lower
    return ExactResult(
        median_unbiased=on_ratio_scale(answer.median_unbiased),
        lower=lower,
        upper=upper,
        mid_p_lower=mid_lower,
        mid_p_upper=mid_upper,
        p_doubled=answer.p_doubled,
        p_by_probability=answer.p_by_probability,
        p_mid=answer.p_mid,
    )


def _refused(beyond: BeyondBudget) -> Finding:
    return finding(
        "stop",
        "exact-beyond-budget",
        limit=beyond.limit,
        budget={"states": BUDGET.states, "bytes": BUDGET.bytes}.get(beyond.limit, BUDGET.work),
        done=int(beyond.patterns_done),
        patterns=int(beyond.patterns),
        states=int(beyond.states),
    )
