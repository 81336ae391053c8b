"""Influence: the covariate patterns that move the exposure's odds ratio most, and what it is without them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.deletion import Deletion, without
from oddsmodel.checks.exposure import MATTERS, Moved, moved
from oddsmodel.checks.influence_views import deletions_table, patterns_table, scatter
from oddsmodel.checks.one_step import one_step, ranked
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.wording import finding, say

LISTED = 10
LEFT_OUT = (1, 5, 10)
FEW_RECORDS = 0.05
"""Share of the records that may be called few; that a larger part moves the estimate is no sign of anything wrong."""

MUCH = 1.0
SOME = 0.5
"""Shifts, in standard errors of the coefficient, that few records should not bring about."""

DIGITS = 3
"""Significant digits of what is reported: more would let a single record be worked out from the difference."""


@dataclass(frozen=True)
class Judged:
    """A deletion and what it does: the largest shift in standard errors, and the odds ratio that moves most.

    few: whether at most a twentieth of the records, or one record, was left out. shift is None where the exposure
    has no estimate without them; moved is None there, and where no column of it has an odds ratio of its own.
    """

    deletion: Deletion
    few: bool
    shift: float | None
    moved: Moved | None
    verdict: Verdict


def check(model: FittedModel) -> CheckResult:
    """Diagnostics by covariate pattern, and exact fits without the 1, 5 and 10 that move the exposure most.

    Patterns are put in order by the one-step shift of the exposure's coefficients, standardised by their
    covariance. "Caution" where few records move a coefficient by a standard error and its odds ratio by ten per
    cent, or leave it without an estimate; "look" from half a standard error on.
    """
    targets = model.exposure_indices or tuple(
        i for i, column in enumerate(model.design.columns) if column.role != "intercept"
    )
    patterns = int(model.patterns.trials.size)
    if not targets:
        return _not_applicable(say("influence-no-columns"))
    if patterns <= model.fit.dimension:
        return _not_applicable(say("influence-saturated", patterns=patterns))
    steps = one_step(model, targets)
    score = np.where(steps.essential, 2.0 * steps.target_distance.max() + 1.0, steps.target_distance)
    top = ranked(score, LISTED)
    judged = [_judge(model, without(model, top[:k], targets), targets) for k in LEFT_OUT if k == 1 or 2 * k <= patterns]
    spoken = _spoken(judged)
    code, facts = _said(model, spoken)
    statistics: dict[str, float | int | None] = {
        "patterns": patterns,
        "patterns_left_out": spoken.deletion.patterns,
        "shift_in_standard_errors": None if spoken.shift is None else _rounded(spoken.shift),
        "odds_ratio_without": None if spoken.moved is None else _rounded(spoken.moved.after),
    }
    missing = say("influence-no-odds-ratio" if spoken.shift is not None else "influence-no-estimate")
    return CheckResult(
        name="influence",
        family="influence",
        title=say("influence-title"),
        verdict=spoken.verdict,
        line=say(code, **facts),
        statistics=statistics,
        reasons={name: missing for name, value in statistics.items() if value is None},
        findings=() if spoken.verdict == "fine" else (finding("caution", code, **facts),),
        tables=(
            deletions_table(model, [one.deletion for one in judged]),
            patterns_table(model, steps, top, targets),
        ),
        figures=(scatter(model, steps),),
        explanation=say("influence-explanation"),
    )


def _not_applicable(reason: str) -> CheckResult:
    names = ("patterns_left_out", "shift_in_standard_errors", "odds_ratio_without")
    return CheckResult(
        name="influence",
        family="influence",
        title=say("influence-title"),
        verdict="not applicable",
        line=reason,
        statistics=dict.fromkeys(names),
        reasons=dict.fromkeys(names, reason),
        explanation=say("influence-explanation"),
    )


def _judge(model: FittedModel, deletion: Deletion, targets: tuple[int, ...]) -> Judged:
    few = deletion.records <= max(1.0, FEW_RECORDS * model.records)
    if deletion.coefficients is None:
        return Judged(deletion, few, None, None, "caution" if few else "fine")
    chosen = list(targets)
    shift = np.abs(deletion.coefficients - model.fit.coefficients)[chosen] / model.fit.standard_errors[chosen]
    largest = float(shift.max())
    ratio = moved(model, deletion.coefficients)
    verdict: Verdict = "fine"
    if few and largest >= SOME and (ratio is None or ratio.change >= MATTERS):
        verdict = "caution" if largest >= MUCH else "look"
    return Judged(deletion, few, largest, ratio, verdict)


def _spoken(judged: Sequence[Judged]) -> Judged:
    """The deletion that the sentence tells of: the smallest of the worst, or the largest that changes little."""
    for verdict in ("caution", "look"):
        for one in judged:
            if one.verdict == verdict:
                return one
    few = [one for one in judged if one.few]
    return few[-1] if few else judged[0]


def _said(model: FittedModel, spoken: Judged) -> tuple[str, dict[str, str | int | float | bool]]:
    """The code of the sentence and its facts, rounded."""
    facts: dict[str, str | int | float | bool] = {
        "patterns": spoken.deletion.patterns,
        "exposed": bool(model.exposure_indices),
        "exposure": "",
    }
    if spoken.moved is not None:
        facts |= {
            "exposure": spoken.moved.label,
            "before": _rounded(spoken.moved.before),
            "after": _rounded(spoken.moved.after),
        }
    if spoken.shift is None:
        return ("few-patterns-carry-the-exposure" if spoken.few else "influence-coarse-carried"), facts
    facts["shift"] = _rounded(spoken.shift)
    if spoken.verdict != "fine":
        return "few-patterns-move-the-exposure", facts
    return ("influence-little" if spoken.few else "influence-coarse"), facts


def _rounded(value: float) -> float:
    return float(f"{value:.{DIGITS}g}")
