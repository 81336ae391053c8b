"""Does the model fit? One check a file; here they are run, and the few lines that speak for all of them chosen."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from importlib import import_module
from typing import TYPE_CHECKING, get_args

from oddsmodel.plan.asked_checks import ASKED_CHECKS, FOR_PREDICTION
from oddsmodel.progress import Progress, Silent
from oddsmodel.results.study import CheckResult, Family, Flow, Verdict
from oddsmodel.wording import say

if TYPE_CHECKING:
    from oddsmodel.model.fitted import FittedModel

__all__ = ["run_checks", "speaking"]

FAMILIES: tuple[Family, ...] = get_args(Family)
"""The seven families, in the order in which they are read."""

CHECKS: tuple[str, ...] = (
    "events_per_parameter",
    "sparse_cells",
    "overlap",
    "hosmer_lemeshow",
    "residual_tests",
    "calibration",
    "roc",
    "brier",
    "linearity",
    "influence",
    "collinearity",
    "independence",
)

OF_ANY_METHOD = ("sparse_cells", "overlap", "independence")
"""Checks that do not rest on the fit by maximum likelihood."""

AS_IF_INDEPENDENT = ("calibration", "influence", "calibration_error")
"""Checks that describe, whose intervals and standard errors take records as independent even where they are not."""

LONG = ("internal_validation",)
"""Checks that take so long that they tell of steps of their own; they are done last."""

WORST: tuple[Verdict, ...] = ("caution", "look", "fine", "not applicable")

SILENT = Silent()


def run_checks(model: FittedModel, progress: Progress = SILENT, flow: Flow | None = None) -> tuple[CheckResult, ...]:
    """All checks of a fit, by family. flow: the model's accounting, for the share of records left out."""
    from oddsmodel.checks import counting

    asked = set(model.also) | (set(FOR_PREDICTION) if model.aim == "prediction" else set())
    names = [*CHECKS, *(name for name in ASKED_CHECKS if name in asked)]
    if not model.at_maximum_likelihood:
        names = [name for name in names if name in OF_ANY_METHOD]
    names.sort(key=lambda name: name in LONG)
    progress.stage("checking", len(names) + 1 - sum(name in LONG for name in names))
    results = [counting.check(model, flow)]
    progress.advance()
    for name in names:
        module = import_module(f"oddsmodel.checks.{name}")
        result = module.check(model, progress) if name in LONG else module.check(model)
        if model.grouping is not None and name in AS_IF_INDEPENDENT and result.verdict != "not applicable":
            result = replace(result, explanation=f"{result.explanation}\n{say('check-as-if-independent')}")
        results.append(result)
        if name not in LONG:
            progress.advance()
    return tuple(sorted(results, key=lambda result: FAMILIES.index(result.family)))


def speaking(checks: Iterable[CheckResult]) -> tuple[CheckResult, ...]:
    """The checks whose lines stand in the report: one a family, the worst verdict, the first of equals."""
    spoken: dict[Family, CheckResult] = {}
    for check in checks:
        before = spoken.get(check.family)
        if check.line and (before is None or WORST.index(check.verdict) < WORST.index(before.verdict)):
            spoken[check.family] = check
    return tuple(spoken[family] for family in FAMILIES if family in spoken)
