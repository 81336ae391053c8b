"""Influence: the covariate patterns that move the exposure's odds ratio most, and what it is without them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.deletion import Deletion, without
from oddsmodel.checks.exposure import MATTERS, Moved, moved
from oddsmodel.checks.influence_views import deletions_table, patterns_table, scatter
from oddsmodel.checks.one_step import OneStep, one_step, ranked
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.wording import finding, say

LISTED = 10
LEFT_OUT = (1, 5, 10)
FEW_RECORDS = 0.05
"""Share of the records that may be called few; what a larger part does when left out is no sign of anything wrong."""

MUCH = 1.0
SOME = 0.5
"""Shifts, in standard errors of the coefficient, that few records should not bring about."""

ORDER: tuple[Verdict, ...] = ("not applicable", "fine", "look", "caution")


@dataclass(frozen=True)
class Judged:
    """A deletion with what it does: the shift in standard errors, and the odds ratio moved most, where it has one."""

    deletion: Deletion
    few: bool
    shift: float | None
    moved: Moved | None
    verdict: Verdict


def check(model: FittedModel) -> CheckResult:
    """Diagnostics by covariate pattern, and exact fits without the 1, 5 and 10 that move the exposure most.

    Patterns are put in order by the one-step shift of the exposure's coefficients, standardised by their
    covariance. A caution where at most a twentieth of the records (or the first pattern alone) moves a coefficient by
    a standard error and its odds ratio by ten per cent, or leaves it without an estimate; a look from half a standard
    error on.
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
    judged = [_judge(model, without(model, top[:k], targets), targets) for k in LEFT_OUT if 2 * k <= patterns]
    spoken = _spoken(judged)
    facts = _facts(model, spoken)
    code = _code(spoken)
    statistics = {
        "patterns": patterns,
        "patterns_left_out": spoken.deletion.patterns,
        "shift_in_standard_errors": _brief(spoken.shift),
        "odds_ratio_without": None if spoken.moved is None else _brief(spoken.moved.after),
    }
    return CheckResult(
        name="influence",
        family="influence",
        title=say("influence-title"),
        verdict=spoken.verdict,
        line=say(f"{code}-line", **facts),
        statistics=statistics,
        reasons=_reasons(spoken, statistics),
        findings=() if spoken.verdict in ("fine", "not applicable") else (finding("caution", code, **facts),),
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
    few = deletion.records <= FEW_RECORDS * model.records
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
