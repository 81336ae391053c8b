"""Pearson and deviance tests of the covariate patterns' counts against a model that fits each of them."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import NamedTuple

from oddsmodel.checks.one_pass import Sums, one_pass
from oddsmodel.checks.severity import severity
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.rows import MOST_PATTERNS
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import finding, say

MOSTLY = 0.8
SMALLEST = 1.0


class ResidualTests(NamedTuple):
    """Statistics, None where infinite; df = patterns − parameters."""

    pearson: float | None
    deviance: float
    df: int


def residual_tests(sums: Sums, parameters: int) -> ResidualTests:
    """Sums of squares of the Pearson and deviance residuals (McCullagh & Nelder 1989, sections 4.4.3 and 4.4.5)."""
    pearson = sums.pearson if math.isfinite(sums.pearson) else None
    return ResidualTests(pearson, sums.deviance, sums.patterns - parameters)


def check(model: FittedModel) -> CheckResult:
    """Both statistics, with p by chi-square where the patterns' expected counts are large enough.

    The rule (Cochran 1954, Biometrics 10:417-451): expected events and expected records without the event are both
    at least 5 in four of five patterns, and at least 1 in all.
    """
    if model.rows.single:
        return _not_applicable(
            dict.fromkeys(("pearson", "pearson_p", "deviance", "deviance_p", "df")),
            say("residual-tests-uncounted", most=MOST_PATTERNS),
        )
    sums = one_pass(model).sums
    patterns = sums.patterns
    tests = residual_tests(sums, model.fit.dimension)
    statistics: dict[str, float | int | None] = {
        "pearson": tests.pearson,
        "pearson_p": None,
        "deviance": tests.deviance,
        "deviance_p": None,
        "df": tests.df,
    }
    reason = _withheld(model, sums, tests)
    if reason is not None or tests.pearson is None:
        return _not_applicable(statistics, reason or say("residual-tests-small-expected", patterns=patterns))
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
        title=say("residual-tests-title"),
        verdict=verdict,
        line=say("residual-tests-line", **facts),
        statistics={**statistics, "pearson_p": pearson_p, "deviance_p": deviance_p},
        findings=() if verdict == "fine" else (finding(severity(verdict), "residual-tests-misfit", **facts),),
        tables=(_table(tests, pearson_p, deviance_p),),
        explanation=say("residual-tests-explanation"),
    )


def _not_applicable(statistics: Mapping[str, float | int | None], reason: str) -> CheckResult:
    return CheckResult(
        name="residual_tests",
        family="fit",
        title=say("residual-tests-title"),
        verdict="not applicable",
        line=reason,
        statistics=statistics,
        reasons={name: reason for name, value in statistics.items() if value is None},
        explanation=say("residual-tests-explanation"),
    )


def _withheld(model: FittedModel, sums: Sums, tests: ResidualTests) -> str | None:
    if model.grouping is not None:
        return say("no-check-of-grouped-records")
    if tests.df < 1:
        return say("residual-tests-saturated", patterns=sums.patterns)
    if sums.enough / sums.patterns < MOSTLY or sums.fewest < SMALLEST:
        return say("residual-tests-small-expected", patterns=sums.patterns)
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
