"""Influence: the covariate patterns that move the exposure's odds ratio most, and what it is without them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.deletion import Deletion, without
from oddsmodel.checks.exposure import MATTERS, Moved, moved
from oddsmodel.checks.influence_views import deletions_table, patterns_table, scatter
from oddsmodel.checks.one_pass import LISTED, interest, one_pass
from oddsmodel.checks.one_step import ranked
from oddsmodel.checks.severity import severity
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.rows import MOST_PATTERNS
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.wording import finding, say

LEFT_OUT = (1, 5, 10)
FEW_RECORDS = 0.05
SEVERAL_RECORDS = 0.02
"""Shares of the records that one pattern, and several, may hold to be called few: a larger part may well move the
estimate without anything being wrong."""

MUCH = 1.0
SOME = 0.75
"""Shifts that k patterns of few records should not bring about, in standard errors times the square root of k. The
patterns of most influence always move the estimate: ten of a thousand ordinary records by about 1.5 standard errors."""

DIGITS = 3
"""Significant digits of what is reported: more would let a single record be worked out from the difference."""


@dataclass(frozen=True)
class Judged:
    """A deletion and what it does: the largest shift in standard errors, and the odds ratio that moves most.

    few: whether few records were left out (one alone always is). shift is None where the exposure
    has no estimate without them; moved is None there, and where no column of it has an odds ratio of its own.
    """

    deletion: Deletion
    few: bool
    shift: float | None
    moved: Moved | None
    verdict: Verdict


def check(model: FittedModel) -> CheckResult:
    """Diagnostics by covariate pattern (by row where these are too many), and exact fits without the foremost 1, 5, 10.

    Patterns are put in order by the one-step shift of the exposure's coefficients, standardised by their
    covariance. "Caution" where k patterns of few records move a coefficient by sqrt(k) standard errors and its odds
    ratio by ten per cent, or one pattern leaves it without an estimate; "look" from three quarters of that on, and
    where several patterns leave it without one.
    """
    targets = interest(model)
    if not targets:
        return _not_applicable(say("influence-no-columns"))
    single = model.rows.single
    seen = one_pass(model)
    patterns = seen.sums.patterns
    if patterns <= model.fit.dimension:
        return _not_applicable(say("influence-saturated", patterns=patterns))
    top = seen.kept.at(ranked(seen.kept.steps.score, LISTED))
    sets = [top.position[:k] for k in LEFT_OUT if k == 1 or 2 * k <= patterns]
    judged = [_judge(model, deletion, targets) for deletion in without(model, sets, targets)]
    spoken = _spoken(judged)
    code, facts = _said(model, spoken)
    shift = None if spoken.shift is None else _rounded(spoken.shift)
    statistics: dict[str, float | int | None] = {
        "patterns": patterns,
        "patterns_left_out": spoken.deletion.patterns,
        "shift_in_standard_errors": shift,
        "odds_ratio_without": None if spoken.moved is None else _rounded(spoken.moved.after),
    }
    missing = say("influence-no-odds-ratio" if shift is not None else "influence-no-estimate")
    reasons = {name: missing for name, value in statistics.items() if value is None}
    if single:
        uncounted = say("influence-one-by-one", most=MOST_PATTERNS)
        statistics |= {"patterns": None, "patterns_left_out": None, "rows_left_out": spoken.deletion.patterns}
        reasons |= {"patterns": uncounted, "patterns_left_out": uncounted}
    return CheckResult(
        name="influence",
        family="influence",
        title=say("influence-title", single=single),
        verdict=spoken.verdict,
        line=say(code, **facts),
        statistics=statistics,
        reasons=reasons,
        findings=() if spoken.verdict == "fine" else (finding(severity(spoken.verdict), code, **facts),),
        tables=(
            deletions_table(model, [one.deletion for one in judged]),
            patterns_table(model, top, targets),
        ),
        figures=(scatter(model, seen),),
        explanation=say("influence-explanation", single=single, most=MOST_PATTERNS),
    )


def _not_applicable(reason: str) -> CheckResult:
    names = ("patterns_left_out", "shift_in_standard_errors", "odds_ratio_without")
    return CheckResult(
        name="influence",
        family="influence",
        title=say("influence-title", single=False),
        verdict="not applicable",
        line=reason,
        statistics=dict.fromkeys(names),
        reasons=dict.fromkeys(names, reason),
        explanation=say("influence-explanation", single=False),
    )


def _judge(model: FittedModel, deletion: Deletion, targets: tuple[int, ...]) -> Judged:
    one = deletion.patterns == 1
    few = deletion.records <= max(1.0, (FEW_RECORDS if one else SEVERAL_RECORDS) * model.records)
    if deletion.coefficients is None:
        return Judged(deletion, few, None, None, "fine" if not few else "caution" if one else "look")
    chosen = list(targets)
    shift = np.abs(deletion.coefficients - model.fit.coefficients)[chosen] / model.fit.standard_errors[chosen]
    largest = float(shift.max())
    ratio = moved(model, deletion.coefficients)
    unusual = largest / float(np.sqrt(deletion.patterns))
    verdict: Verdict = "fine"
    if few and unusual >= SOME and (ratio is None or ratio.change >= MATTERS):
        verdict = "caution" if unusual >= MUCH else "look"
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
    if model.rows.single:
        facts["single"] = True
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
