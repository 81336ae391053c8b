"""Findings for models near the edge of what maximum likelihood can do, and what is said of other methods."""

from __future__ import annotations

import math
from collections.abc import Sequence

from oddsmodel.findings import Finding
from oddsmodel.inference.penalised import maximise_penalised
from oddsmodel.likelihood import JeffreysPenalisedLikelihood
from oddsmodel.likelihood.log_f import prior_interval
from oddsmodel.measures.scale import exponential
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CoefficientResult, TermTest
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

SEEN, UNSEEN = 0.01, 0.05


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


def near_the_edge(
    model: FittedModel, found: Sequence[CoefficientResult], tests: Sequence[TermTest]
) -> tuple[Finding, ...]:
    """Sparse-data bias, intervals that disagree, and Wald tests that fail, of the exposure's odds ratios."""
    if model.method != "maximum likelihood" or model.grouping is not None:
        return ()
    told: list[Finding] = []
    parameters = max(1, len(model.design.columns) - 1)
    fewest = min(model.events, model.records - model.events)
    shown = [position for position in model.exposure_indices if model.design.columns[position].shown]
    if fewest < FEW_EVENTS * parameters and model.rows.number <= MOST_ROWS and shown:
        told.extend(_bias(model, shown))
    for position in shown:
        told.extend(_disagreement(found[position]))
        told.extend(_wald_that_fails(found[position], tests))
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


def _disagreement(one: CoefficientResult) -> list[Finding]:
    error = one.standard_error
    if not error:
        return []
    pairs = ((one.profile.lower, one.wald.lower), (one.profile.upper, one.wald.upper))
    apart = [abs(math.log(limit / other)) / error for limit, other in pairs if limit and other]
    distance = max(apart, default=0.0)
    return [finding("note", "limits-disagree", label=one.label, distance=distance)] if distance >= APART else []


def _wald_that_fails(one: CoefficientResult, tests: Sequence[TermTest]) -> list[Finding]:
    """Hauck & Donner 1977, Journal of the American Statistical Association 72:851-853: the Wald statistic of a large
    effect falls as the effect grows. Told of a term of one coefficient that the likelihood ratio sees clearly."""
    test = next((test for test in tests if test.term == one.term and test.df == 1), None)
    if test is None or test.p is None or one.wald.p is None:
        return []
    fails = test.p < SEEN and one.wald.p > UNSEEN
    return [finding("caution", "wald-fails", label=one.label)] if fails else []
