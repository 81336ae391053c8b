"""Internal validation: how well the model would do on other records like these."""

from __future__ import annotations

from oddsmodel.checks.performance import Scores
from oddsmodel.checks.probability_groups import MOST_SORTED
from oddsmodel.checks.pseudo_r2 import expected_shrinkage, gain
from oddsmodel.checks.refits import ColumnsAnew, refits_of
from oddsmodel.checks.resamples import MOST_RECORDS
from oddsmodel.checks.severity import severity
from oddsmodel.checks.validation import (
    CrossValidated,
    Measures,
    Optimism,
    Validation,
    bootstrap_optimism,
    cross_validated,
)
from oddsmodel.inference.recession_cone import single_threaded
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
from oddsmodel.progress import Progress, Silent
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import finding, say

NAME = "internal_validation"

BY_CONSTRUCTION = ("slope", "in_the_large")
"""On the records that a model with an intercept was fitted to these are 1 and 0, which says nothing."""

MOST_RESAMPLES, FEWEST_RESAMPLES = 200, 20
FOLDS = 10
RESAMPLES_A_REPEAT = 20
"""Cross-validation is repeated once for so many resamples: 10 times 10 folds beside 200 resamples."""

WORK = 8e9
COLUMNS_ANEW = 100.0
"""What all resamples together may cost, and a column made anew, for each row; see `_affordable`."""

FEWEST_OF_AN_OUTCOME = 10
FEWEST_GROUPS = 10
MOSTLY = 0.5
"""Share of the resamples that must have a fit."""

GOOD_SLOPE, POOR_SLOPE = 0.9, 0.8

SILENT = Silent()


def check(model: FittedModel, progress: Progress = SILENT) -> CheckResult:
    """Optimism by the bootstrap and repeated cross-validation of area, calibration and Brier score.

    Records are drawn as the design demands: one by one, whole groups, or cases and controls apart; what depends on the
    intercept is left out where the design fixes the share of cases. A slope below 0.9 is worth a look, below 0.8 a
    caution: predictions for other records would be that much too far from the middle.
    """
    reason = _withheld(model)
    if reason is not None:
        return _not_applicable(reason)
    population, refits = refits_of(model)
    resamples = _affordable(model, population.rows, isinstance(refits, ColumnsAnew))
    if resamples < FEWEST_RESAMPLES:
        return _not_applicable(_too_large(model))
    with single_threaded():
        validation = Validation(
            population=population,
            refits=refits,
            absolute=model.study_design in QUANTITY,
            balanced=any(column.kind == "intercept" for column in model.design.columns),
            seed=model.seed,
            name=model.name,
        )
        apparent = _apparent(validation)
        if apparent is None:
            return _not_applicable(say("prediction-one-risk"))
        folds = FOLDS if model.grouping is None else min(FOLDS, model.grouping.number)
        repeats = max(1, resamples // RESAMPLES_A_REPEAT)
        progress.stage("validating", resamples + folds * repeats)
        optimism = bootstrap_optimism(validation, resamples, progress.advance)
        crossed = cross_validated(validation, folds, repeats, progress.advance)
    return _result(model, apparent, optimism, crossed)


def _affordable(model: FittedModel, rows: int, anew: bool) -> int:
    """How many resamples the rows and columns allow: 200, or fewer where they would take minutes.

    A fit of p columns costs about rows × (p²/2 + 200), and more where its columns are made anew.
    """
    p = model.fit.coefficients.size
    each = p * p / 2.0 + 200.0 + (COLUMNS_ANEW * p if anew else 0.0)
    return min(MOST_RESAMPLES, int(WORK / (each * rows)))


def _withheld(model: FittedModel) -> str | None:
    """Why nothing is resampled, or None."""
    rarer = min(model.events, model.records - model.events)
    if not _parameters(model):
        return say("prediction-no-columns")
    if model.study_design == "matched case-control":
        return say("validation-matched")
    if rarer < FEWEST_OF_AN_OUTCOME:
        return say("validation-few-events", fewest=FEWEST_OF_AN_OUTCOME)
    if model.grouping is not None and model.grouping.number < FEWEST_GROUPS:
        return say("validation-few-groups", groups=model.grouping.number, fewest=FEWEST_GROUPS)
    return _too_large(model) if model.rows.number > MOST_SORTED or model.records >= MOST_RECORDS else None


def _parameters(model: FittedModel) -> int:
    return sum(column.kind != "intercept" for column in model.design.columns)


def _too_large(model: FittedModel) -> str:
    expected = None
    if model.grouping is None:
        expected = expected_shrinkage(gain(model).likelihood_ratio, _parameters(model))
    return say("validation-too-large", expected=expected)


def _not_applicable(reason: str) -> CheckResult:
    nothing = dict.fromkeys(
        ("area", "brier", *(f"{name}_{kind}" for name in Measures._fields for kind in ("corrected", "cross_validated")))
    )
    return CheckResult(
        name=NAME,
        family="fit",
        title=say("validation-title"),
        verdict="not applicable",
        line=reason,
        statistics=nothing,
        reasons=dict.fromkeys(nothing, reason),
        explanation=say("validation-explanation"),
    )


def _apparent(validation: Validation) -> Measures | None:
    """The measures on the records that the model was fitted to; None where all have one linear predictor."""
    events, trials = validation.population.counted(validation.population.cells)
    linear = validation.refits.linear(events[None], trials[None])[0]
    if linear is None:
        return None
    pairs = Scores.of(linear).pairs(events, trials)
    measured = validation.measured(linear, events, trials, pairs)
    return None if measured is None else validation.own(linear, events, trials, pairs)


def _result(model: FittedModel, apparent: Measures, optimism: Optimism, crossed: CrossValidated) -> CheckResult:
    corrected, few = _corrected(apparent, optimism), say("validation-few-fitted")
    held = crossed.measures if crossed.fitted >= MOSTLY * crossed.folds * crossed.repeats else None
    statistics: dict[str, float | int | None] = {}
    reasons: dict[str, str] = {}
    no_risk = say("validation-no-risk", design=model.study_design)
    for place, name in enumerate(Measures._fields):
        known = apparent[place] is not None
        found = {"corrected": corrected, "cross_validated": held, "optimism": optimism.optimism}
        if name in BY_CONSTRUCTION:
            del found["optimism"]
        else:
            statistics[name] = apparent[place]
        for kind, measures in found.items():
            statistics[f"{name}_{kind}"] = None if measures is None else measures[place]
        own = {key for key, value in statistics.items() if value is None and key not in reasons}
        reasons |= dict.fromkeys(own, few if known else no_risk)
    statistics |= {
        "resamples": optimism.resamples,
        "resamples_fitted": optimism.fitted,
        "folds": crossed.folds,
        "repeats": crossed.repeats,
        "folds_fitted": crossed.fitted,
    }
    slope = statistics["slope_corrected"]
    verdict: Verdict = "look" if slope is None or slope < GOOD_SLOPE else "fine"
    if slope is not None and slope < POOR_SLOPE:
        verdict = "caution"
    facts = {
        "area": apparent.area,
        "corrected": statistics["area_corrected"],
        "slope": slope,
        "verdict": verdict,
    }
    return CheckResult(
        name=NAME,
        family="fit",
        title=say("validation-title"),
        verdict=verdict,
        line=say("validation-line", **facts),
        statistics=statistics,
        reasons=reasons,
        findings=() if verdict == "fine" else (finding(severity(verdict), "predictions-too-extreme", **facts),),
        tables=(_table(apparent, corrected, optimism, crossed, held),),
        explanation=say("validation-explanation"),
    )


def _corrected(apparent: Measures, optimism: Optimism) -> Measures | None:
    if optimism.optimism is None or optimism.fitted < MOSTLY * optimism.resamples:
        return None
    pairs = zip(apparent, optimism.optimism, strict=True)
    return Measures(*(None if one is None or other is None else one - other for one, other in pairs))


def _table(
    apparent: Measures, corrected: Measures | None, optimism: Optimism, crossed: CrossValidated, held: Measures | None
) -> Table:
    columns = (
        TableColumn("measure", say("validation-heading-measure")),
        TableColumn("apparent", say("validation-heading-apparent"), "number"),
        TableColumn("optimism", say("validation-heading-optimism"), "number"),
        TableColumn("corrected", say("validation-heading-corrected"), "number"),
        TableColumn("cross_validated", say("validation-heading-cross-validated"), "number"),
    )
    rows: list[tuple[Cell, ...]] = []
    for place, name in enumerate(Measures._fields):
        if apparent[place] is None:
            continue
        own: tuple[Cell, ...] = (None, None)
        if name not in BY_CONSTRUCTION:
            own = apparent[place], None if optimism.optimism is None else optimism.optimism[place]
        others = (None if one is None else one[place] for one in (corrected, held))
        rows.append((say(f"validation-{name}"), *own, *others))
    note = say(
        "validation-note",
        resamples=optimism.resamples,
        resamples_fitted=optimism.fitted,
        folds=crossed.folds,
        repeats=crossed.repeats,
        folds_fitted=crossed.fitted,
    )
    return Table("internal_validation", say("validation-title"), columns, tuple(rows), note=note)
