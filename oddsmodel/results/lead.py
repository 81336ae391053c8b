"""Which model answers the question, and which of its intervals leads."""

from __future__ import annotations

from collections.abc import Sequence

from oddsmodel.results.study import CoefficientResult, CrudeEstimate, ModelResult, StudyResults
from oddsmodel.results.tables import Interval

CONVERGED, SEPARATED = "converged", "no finite maximum"
EXACT = "exact"


def lead_model(study: StudyResults) -> ModelResult | None:
    """The model that answers: the first the plan asked for, estimated or not. No other takes its place."""
    asked = [model for model in study.models if not model.added_by_program]
    return next(iter(asked or study.models), None)


def is_estimated(model: ModelResult) -> bool:
    return model.status == CONVERGED


def is_told(model: ModelResult) -> bool:
    """Whether there is something to tell of a model's odds ratios: it is estimated, or separated with what is left."""
    return is_estimated(model) or bool(model.coefficients)


def companion(study: StudyResults, model: ModelResult) -> ModelResult | None:
    """The model that the program added beside one without a finite answer, where it was estimated."""
    beside = f"{model.id}-penalised"
    return next((one for one in study.models if one.added_by_program and one.id == beside and is_estimated(one)), None)


def has_profile(model: ModelResult) -> bool:
    """Whether the model has a likelihood whose profile gives limits; taken to be so where every limit is withheld."""
    if model.variant.get("covariance", "model") != "model" or model.method == EXACT:
        return False
    profile = any(limit is not None for one in model.coefficients for limit in (one.profile.lower, one.profile.upper))
    wald = any(limit is not None for one in model.coefficients for limit in (one.wald.lower, one.wald.upper))
    return profile or not wald


def lead_interval(model: ModelResult, estimate: CoefficientResult | CrudeEstimate) -> Interval:
    """The exact limits where there are any, else the profile limits where the model has them, one-sided ones included,
    else the Wald limits."""
    if isinstance(estimate, CoefficientResult) and estimate.exact is not None:
        return Interval(estimate.exact.lower, estimate.exact.upper)
    limits = estimate.profile if has_profile(model) else estimate.wald
    return Interval(limits.lower, limits.upper) if limits is not None else Interval(None, None)


def exposures_shown(model: ModelResult) -> tuple[CoefficientResult, ...]:
    """The exposure's estimates that have an odds ratio of their own: what answers the question."""
    return in_answer(model.coefficients, model.averages)


def in_answer(
    coefficients: Sequence[CoefficientResult], averages: Sequence[CoefficientResult]
) -> tuple[CoefficientResult, ...]:
    """The exposure's coefficients that are shown; of a column compared with its average, that comparison instead."""
    found: list[CoefficientResult] = []
    averaged = {one.term: [other for other in averages if other.term == one.term] for one in averages}
    for one in coefficients:
        if one.role == "exposure" and one.shown:
            if one.term not in averaged:
                found.append(one)
            elif averaged[one.term]:
                found.extend(averaged[one.term])
                averaged[one.term] = []
    return tuple(found)
