"""How many records the criteria for prediction models ask for, beside how many there are."""

from __future__ import annotations

import math
from collections.abc import Mapping

from oddsmodel.checks.pseudo_r2 import Gain, expected_shrinkage, gain
from oddsmodel.checks.severity import severity
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import finding, say

NAME = "sample_size_for_prediction"

SHRINKAGE = 0.9
LITTLE = 0.8
"""An expected shrinkage below this is a caution."""
OPTIMISM = 0.05
MARGIN = 0.05
MEAN_ERROR = 0.05
CONVENTION = 0.15
"""Share of the largest R² that is taken where nothing better is known (Riley et al. 2020)."""

MOST_PARAMETERS = 30
"""The formula for the mean absolute error was found by simulation with up to so many parameters."""

Z = 1.959964
"""Of the 95% interval of the overall risk, as the criterion states it."""

CRITERIA = ("shrinkage", "optimism", "overall_risk", "mean_error")


def size_for_shrinkage(parameters: int, r2: float, shrinkage: float = SHRINKAGE) -> int:
    """Records from which a shrinkage of at least so much is to be expected, with Cox & Snell's R² of r2.

    n = p / ((S − 1) log(1 − R²/S)) (Riley et al. 2019, Statistics in Medicine 38:1276-1296, equation 11).

    >>> size_for_shrinkage(30, 0.05)
    5249
    """
    return math.ceil(parameters / ((shrinkage - 1.0) * math.log1p(-r2 / shrinkage)))


def size_for_optimism(parameters: int, r2: float, most: float) -> int:
    """Records from which Nagelkerke's R² is too large by at most 0.05 on the records fitted; most: the largest r2.

    That of the shrinkage S = R² / (R² + 0.05 most) (Riley et al. 2019, equation 23, from memory).
    """
    return size_for_shrinkage(parameters, r2, r2 / (r2 + OPTIMISM * most))


def size_for_overall_risk(share: float) -> int:
    """Records from which the 95% interval of the overall risk reaches at most 0.05 either way.

    (1.96/0.05)² share (1 − share) (Riley et al. 2020, BMJ 368:m441, step 1).

    >>> size_for_overall_risk(0.05)
    73
    """
    return math.ceil((Z / MARGIN) ** 2 * share * (1.0 - share))


def size_for_mean_error(parameters: int, share: float) -> int:
    """Records from which probabilities are off by 0.05 on average; share: of the rarer outcome.

    exp((−0.508 + 0.259 log share + 0.504 log p − log 0.05) / 0.544) (van Smeden et al. 2019, Statistical Methods in
    Medical Research 28:2455-2474, as in Riley et al. 2020, step 2; from memory).

    >>> size_for_mean_error(30, 0.05)
    544
    """
    log = (-0.508 + 0.259 * math.log(share) + 0.504 * math.log(parameters) - math.log(MEAN_ERROR)) / 0.544
    return math.ceil(math.exp(log))


def check(model: FittedModel) -> CheckResult:
    """The criteria of Riley et al. with the fit of the model itself, and with the R² that convention takes.

    They are meant for before the records are gathered. After, with the model's own R² made smaller by its expected
    shrinkage, they say how far the records reach. In a case-control study the share of cases, and with it R², is that
    of the sampling: the first criterion then holds for records sampled likewise, and the others do not apply.
    """
    title, explanation = say("prediction-size-title"), say("prediction-size-explanation")
    parameters = sum(column.kind != "intercept" for column in model.design.columns)
    reason = _left_out(model, parameters)
    if reason is not None:
        nothing: dict[str, float | int | None] = dict.fromkeys(
            ("records", "needed", "expected_shrinkage", *(f"needed_for_{one}" for one in CRITERIA))
        )
        return CheckResult(
            name=NAME,
            family="counting",
            title=title,
            verdict="not applicable",
            line=reason,
            statistics=nothing,
            reasons=dict.fromkeys(nothing, reason),
            explanation=explanation,
        )
    known = gain(model)
    own, reasons = _sizes(model, known, parameters, None)
    usual, _ = _sizes(model, known, parameters, CONVENTION * known.most)
    shrinkage = expected_shrinkage(known.likelihood_ratio, parameters)
    asked = [size for size in own.values() if size is not None]
    needed = None if shrinkage is None else max(asked)
    verdict: Verdict = "fine"
    if needed is None or shrinkage is None or shrinkage < LITTLE:
        verdict = "caution"
    elif model.records < needed:
        verdict = "look"
    facts = {"analysed_records": model.records, "needed": needed, "shrinkage": shrinkage}
    statistics: dict[str, float | int | None] = {
        "records": model.records,
        "needed": needed,
        "expected_shrinkage": shrinkage,
        **{f"needed_for_{one}": own[one] for one in CRITERIA},
    }
    reasons = {f"needed_for_{one}": reason for one, reason in reasons.items()}
    if shrinkage is None:
        reasons |= dict.fromkeys(("needed", "expected_shrinkage"), say("prediction-size-no-gain"))
    return CheckResult(
        name=NAME,
        family="counting",
        title=title,
        verdict=verdict,
        line=say("prediction-size-line", **facts),
        statistics=statistics,
        reasons=reasons,
        findings=() if verdict == "fine" else (finding(severity(verdict), "too-few-records-for-prediction", **facts),),
        tables=(_table(own, usual),),
        explanation=explanation,
    )


def _left_out(model: FittedModel, parameters: int) -> str | None:
    if model.grouping is not None:
        return say("no-check-of-grouped-records")
    if not 0 < model.events < model.records:
        return say("prediction-one-outcome")
    return None if parameters else say("prediction-no-columns")


def _sizes(
    model: FittedModel, known: Gain, parameters: int, r2: float | None
) -> tuple[dict[str, int | None], dict[str, str]]:
    """The size that each criterion asks for with an R² of r2, or of the model's own; and why there is none."""
    if r2 is None:
        shrinkage = expected_shrinkage(known.likelihood_ratio, parameters)
        r2 = None if shrinkage is None else shrinkage * known.cox_snell
    share = min(model.events, model.records - model.events) / model.records
    sizes: dict[str, int | None] = dict.fromkeys(CRITERIA)
    reasons: dict[str, str] = {}
    if r2 is not None:
        sizes["shrinkage"] = size_for_shrinkage(parameters, r2)
        sizes["optimism"] = size_for_optimism(parameters, r2, known.most)
    else:
        reasons = dict.fromkeys(("shrinkage", "optimism"), say("prediction-size-no-gain"))
    if parameters <= MOST_PARAMETERS:
        sizes["mean_error"] = size_for_mean_error(parameters, share)
    else:
        reasons["mean_error"] = say("prediction-size-many-parameters", most=MOST_PARAMETERS)
    sizes["overall_risk"] = size_for_overall_risk(share)
    if model.study_design not in QUANTITY:
        reason = say("prediction-size-no-risk", design=model.study_design)
        for one in CRITERIA[1:]:
            sizes[one], reasons[one] = None, reason
    return sizes, reasons


def _table(own: Mapping[str, int | None], usual: Mapping[str, int | None]) -> Table:
    columns = (
        TableColumn("criterion", say("prediction-size-heading-criterion")),
        TableColumn("own", say("prediction-size-heading-own"), "number"),
        TableColumn("usual", say("prediction-size-heading-usual"), "number"),
    )
    rows = tuple((say(f"prediction-size-{one}"), own[one], usual[one]) for one in CRITERIA)
    return Table(
        "size_for_prediction",
        say("prediction-size-table"),
        columns,
        rows,
        note=say("prediction-size-note", share=CONVENTION),
    )
