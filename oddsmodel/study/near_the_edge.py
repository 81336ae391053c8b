"""Findings for models near the edge of what maximum likelihood can do, and what is said of other methods."""

from __future__ import annotations

import math
from collections.abc import Sequence

from oddsmodel.findings import Finding
from oddsmodel.inference.penalised import maximise_penalised
from oddsmodel.inference.wald_failure import wald_failure
from oddsmodel.likelihood import JeffreysPenalisedLikelihood
from oddsmodel.likelihood.log_f import prior_interval
from oddsmodel.measures.scale import exponential
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CoefficientResult
from oddsmodel.study.prepare import Prepared
from oddsmodel.study.priors import prior_positions
from oddsmodel.wording import finding

FEW_EVENTS = 10
"""Events, or records without the event, for each coefficient below which bias is looked for (common practice)."""

MOST_ROWS = 20_000
BIAS = math.log(1.1)
"""Difference of the log odds ratios from which it is told: ten per cent of the odds ratio (common practice)."""

APART = 0.25
"""Distance of a profile limit from its Wald limit, in standard errors, from which it is told (common practice)."""


def of_method(model: FittedModel, prepared: Prepared) -> tuple[Finding, ...]:
    """What must be known of a model that was not fitted by maximum likelihood."""
    if model.method == "maximum likelihood":
        return ()
    told = [finding("note", "checks-of-method")]
    prior = prepared.section.prior
    if prior is not None:
        labels = [model.design.columns[position].label for position in prior_positions(prior.columns, model.design)]
        lower, upper = prior_interval(prior.m)
        told.append(finding("caution", "prior-in-words", m=prior.m, labels=labels, lower=lower, upper=upper))
    return tuple(told)


def near_the_edge(model: FittedModel, found: Sequence[CoefficientResult]) -> tuple[Finding, ...]:
    """Sparse-data bias, intervals that disagree, and Wald tests that fail, of the exposure's odds ratios."""
    if not model.at_maximum_likelihood or model.grouping is not None:
        return ()
    told: list[Finding] = []
    parameters = max(1, len(model.design.columns) - 1)
    fewest = min(model.events, model.records - model.events)
    shown = [position for position in model.exposure_indices if model.design.columns[position].shown]
    if fewest < FEW_EVENTS * parameters and model.rows.number <= MOST_ROWS and shown:
        told.extend(_bias(model, shown))
    apart = {position: _distance(found[position]) for position in shown}
    far = [position for position in shown if apart[position] >= APART]
    # where profile and Wald limits agree, the Wald test says what the likelihood says
    falling = wald_failure(model.fit).falling if far else None
    for position in far:
        label = found[position].label
        told.append(finding("note", "limits-disagree", label=label, distance=apart[position]))
        if falling is not None and falling[position]:
            told.append(finding("caution", "wald-fails", label=label))
    return tuple(told)


def _bias(model: FittedModel, shown: Sequence[int]) -> list[Finding]:
    penalised = maximise_penalised(JeffreysPenalisedLikelihood(model.binomial)).fit
    if penalised.status != "converged":
        return []
    told = []
    for position in shown:
        column = model.design.columns[position]
        before, after = (float(fit.coefficients[position]) * column.per for fit in (model.fit, penalised))
        plain, other = exponential(before), exponential(after)
        if abs(before - after) >= BIAS and plain is not None and other is not None:
            told.append(finding("caution", "sparse-data-bias", label=column.label, plain=plain, penalised=other))
    return told


def _distance(one: CoefficientResult) -> float:
    """How far the profile limits are from the Wald limits at most, in standard errors."""
    if not one.standard_error:
        return 0.0
    pairs = ((one.profile.lower, one.wald.lower), (one.profile.upper, one.wald.upper))
    return max(
        (abs(math.log(limit / other)) / one.standard_error for limit, other in pairs if limit and other), default=0.0
    )
