"""Pearson and deviance tests of the covariate patterns' counts against a model that fits each of them."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from oddsmodel.checks.residuals import PatternResiduals, pattern_residuals
from oddsmodel.checks.severity import severity
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import finding, say

LARGE = 5.0
MOSTLY = 0.8
SMALLEST = 1.0


class ResidualTests(NamedTuple):
    """Statistics, None where infinite; df = patterns − parameters."""

    pearson: float | None
    deviance: float
    df: int


def residual_tests(residuals: PatternResiduals, patterns: int, parameters: int) -> ResidualTests:
    """Sums of squares of the Pearson and deviance residuals (McCullagh & Nelder 1989, sections 4.4.3 and 4.4.5)."""
    with np.errstate(over="ignore"):
        pearson = float((residuals.pearson**2).sum())
    deviance = float((residuals.deviance**2).sum())
    return ResidualTests(pearson if np.isfinite(pearson) else None, deviance, patterns - parameters)


def check(model: FittedModel) -> CheckResult:
    """Both statistics, with p by chi-square where the patterns' expected counts are large enough.

    The rule (Cochran 1954, Biometrics 10:417-451): expected events and expected records without the event are both
    at least 5 in four of five patterns, and at least 1 in all.
    """
    residuals = pattern_residuals(model)
    patterns = int((model.patterns.trials > 0.0).sum())
    tests = residual_tests(residuals, patterns, model.fit.dimension)
    statistics: dict[str, float | int | None] = {
        "pearson": tests.pearson,
        "pearson_p": None,
        "deviance": tests.deviance,
        "deviance_p": None,
        "df": tests.df,
    }
    title, explanation = say("residual-tests-title"), say("residual-tests-explanation")
    reason = _withheld(model, residuals, tests, patterns)
    if reason is not None or tests.pearson is None:
        reason = reason or say("residual-tests-small-expected", patterns=patterns)
        return CheckResult(
            name="residual_tests",
            family="fit",
            title=title,
            verdict="not applicable",
            line=reason,
            statistics=statistics,
            reasons={name: reason for name, value in statistics.items() if value is None},
            explanation=explanation,
        )
    pearson_p, deviance_p = chi_square_p(tests.pearson, tests.df), chi_square_p(tests.deviance, tests.df)
    least = min(pearson_p, deviance_p)
    verdict: Verdict = "fine" if least >= 0.05 else "look" if least >= 0.01 else "caution"
    facts = {
        "patterns": patterns,
        "df": tests.df,
        "pearson": tests.pearson,
        "pearson_p": pearson_p,
        "deviance": tests.deviance,
        "deviance_p": deviance_p,
    }
    return CheckResult(
        name="residual_tests",
        family="fit",
        title=title,
        verdict=verdict,
        line=say("residual-tests-line", **facts),
        statistics={**statistics, "pearson_p": pearson_p, "deviance_p": deviance_p},
        findings=() if verdict == "fine" else (finding(severity(verdict), "residual-tests-misfit", **facts),),
        tables=(_table(tests, pearson_p, deviance_p),),
        explanation=explanation,
    )


def _withheld(model: FittedModel, residuals: PatternResiduals, tests: ResidualTests, patterns: int) -> str | None:
    if model.grouping is not None:
        return say("no-check-of-grouped-records")
    if tests.df < 1:
        return say("residual-tests-saturated", patterns=patterns)
    least = model.patterns.trials * np.minimum(residuals.probability, residuals.complement)
    least = least[model.patterns.trials > 0.0]
    share = float((least >= LARGE).mean())
    if share < MOSTLY or float(least.min()) < SMALLEST:
        return say("residual-tests-small-expected", patterns=patterns)
    return None


def _table(tests: ResidualTests, pearson_p: float, deviance_p: float) -> Table:
    columns = (
        TableColumn("statistic", "Statistic"),
        TableColumn("value", "Value", "number"),
        TableColumn("df", "Degrees of freedom", "number"),
        TableColumn("p", "p-value", "p"),
    )
    rows = (
        ("Pearson chi-square", tests.pearson, tests.df, pearson_p),
        ("Deviance", tests.deviance, tests.df, deviance_p),
    )
    return Table("pearson_and_deviance", "Covariate patterns against the model", columns, rows)
