"""Every level of a category against the average of its levels: sum contrasts with their own intervals."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from oddsmodel.inference import Fit, maximise, profile
from oddsmodel.inference.clustered import clustered_covariance, small_sample_factor
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.measures.coefficients import standard_error_of
from oddsmodel.measures.counts import design_levels, exposure_counts, level_columns
from oddsmodel.measures.crude import plain_exposures
from oddsmodel.measures.limits import profile_limits
from oddsmodel.measures.one_contrast import contrast_result
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.study import CoefficientResult, CrudeEstimate
from oddsmodel.wording import say


def network_average(model: FittedModel, name: str) -> tuple[CoefficientResult, ...]:
    """The odds ratio of each level of an exposure against the average over its levels, in the order of the plan.

    The average is the unweighted mean of the log odds over the k levels that the model has, so that level i is
    compared by β_i − (β_1 + ... + β_k) / k with β = 0 for the reference: the same contrasts whatever the reference,
    and those of all levels, of which k − 1 are free (sum contrasts: the effects of Scheffé 1959, The Analysis of
    Variance, with equal weights). Limits are profile-likelihood limits of these contrasts. Crude: the same contrasts in
    the model of the exposure alone on the same records. Where records belong to groups, standard errors allow for that
    and there are no profile limits. Empty where the column enters in another way than by levels against a reference.
    """
    if name not in plain_exposures(model) or not level_columns(model, name):
        return ()
    own = {str(model.design.columns[position].level): position for position in level_columns(model, name)}
    present = design_levels(model, name)
    declared = model.columns[name].levels
    order = [level for level in declared if level in present] or list(present)
    p = len(model.design.columns)
    places = np.zeros((len(order), p))
    for row, level in enumerate(order):
        if level in own:
            places[row, own[level]] = 1.0
    contrasts = places - places.mean(axis=0)
    limits = profile_limits(model, contrasts)
    crude = _crude(model, name, order)
    term = model.design.columns[next(iter(own.values()))].term
    label = model.columns[name].label
    return tuple(
        contrast_result(
            float(contrasts[row] @ model.fit.coefficients),
            standard_error_of(model, contrasts[row]),
            limits,
            row,
            model.level,
            term=term,
            role="exposure",
            label=say("average-label", label=label, level=level),
            at=level,
            against=say("network-average"),
            crude=crude[row] if crude else None,
        )
        for row, level in enumerate(order)
    )


def _crude(model: FittedModel, name: str, order: Sequence[str]) -> list[CrudeEstimate]:
    """The crude estimates of the levels in order; none where a level has no event, or nothing but events."""
    counted = exposure_counts(model, name)
    assert counted is not None
    place = [counted.levels.index(level) for level in order]
    records = counted.records[place].astype(np.float64)
    events = counted.events[place].astype(np.float64)
    fit = maximise(BinomialLikelihood(np.eye(len(order)), events, trials=records))
    if fit.status != "converged":
        return []
    contrasts: Array = np.eye(len(order)) - 1.0 / len(order)
    errors = _crude_errors(model, name, order, fit, contrasts)
    limits = profile(fit, contrasts, model.level) if model.grouping is None else None
    found = []
    for row, level in enumerate(order):
        estimate = float(contrasts[row] @ fit.coefficients)
        one = contrast_result(estimate, errors[row], limits, row, model.level, term=name, role="exposure", label=level)
        profiled = one.profile if limits is not None else None
        found.append(CrudeEstimate(int(counted.records.sum()), one.odds_ratio, one.wald, profiled))
    return found


def _crude_errors(
    model: FittedModel, name: str, order: Sequence[str], fit: Fit, contrasts: Array
) -> list[tuple[float | None, int | None]]:
    """The standard errors of the crude contrasts, which allow for groups where the records belong to some."""
    grouping, covariance = model.grouping, fit.covariance
    if grouping is not None:
        factor = small_sample_factor(grouping.number, model.records, len(order))
        if factor is None or grouping.without_error[level_columns(model, name)].any():
            return [(None, grouping.df)] * len(order)
        own = level_columns(model, name)
        held, patterns = model.grouped
        indicators = np.column_stack([patterns.X[:, k] == 1.0 for k in own])
        levels = [str(model.design.columns[k].level) for k in own]
        reference = next(level for level in order if level not in levels)
        places = np.array([order.index(level) for level in (*levels, reference)])
        at = np.where(indicators.any(axis=1), indicators.argmax(axis=1), len(levels))
        index = places[at][patterns.index]
        covariance = clustered_covariance(fit, index, held.event, grouping.codes, factor, held.counts)
    errors = np.sqrt(np.maximum(0.0, np.einsum("ij,jk,ik->i", contrasts, covariance, contrasts)))
    return [(float(error), None if grouping is None else grouping.df) for error in errors]
