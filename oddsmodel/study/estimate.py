"""From a fitted model to its result: intervals, tests, crude estimates, checks, tables and pictures."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import numpy as np

from oddsmodel.checks import run_checks
from oddsmodel.findings import Finding
from oddsmodel.measures.coefficients import coefficients
from oddsmodel.measures.crude import crude
from oddsmodel.measures.crude_to_adjusted import adjustment_findings, crude_to_adjusted_table
from oddsmodel.measures.levels import common_outcome, levels
from oddsmodel.measures.limits import profile_limits
from oddsmodel.measures.network_average import network_average
from oddsmodel.measures.trend import trend_table, trends, trends_withheld
from oddsmodel.measures.two_by_two_table import two_by_two_tables
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.kept import People
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.types import Column
from oddsmodel.results.figures import Figure
from oddsmodel.results.lead import in_answer
from oddsmodel.results.study import CertificateResult, CoefficientResult, ModelResult
from oddsmodel.results.tables import Table
from oddsmodel.study.corrected_intercepts import corrected_intercepts
from oddsmodel.study.exact import exact_coefficients
from oddsmodel.study.fitting import Fitted
from oddsmodel.study.near_the_edge import near_the_edge, of_method
from oddsmodel.study.pictures import estimates_figure, flow_figure
from oddsmodel.study.prepare import Prepared
from oddsmodel.study.separated import separated_coefficients
from oddsmodel.study.term_tests import null_log_likelihood, term_tests
from oddsmodel.wording import finding, say

COMPLETE = "complete records"
LIKELIHOODS = ("log_likelihood", "null_log_likelihood")


def estimate(
    prepared: Prepared, fitted: Fitted, plan: StudyPlan, columns: Mapping[str, Column], kept: People, progress: Progress
) -> ModelResult:
    """Everything the report says of one model; for one that could not be estimated, who was counted and why not."""
    if fitted.separated is not None or (fitted.model is not None and fitted.model.method == "exact"):
        return without_maximum(prepared, fitted, plan, columns, kept, progress)
    model, certificate = fitted.model, fitted.certificate
    if model is None:
        return model_result(prepared, fitted, plan, columns)
    p = model.fit.coefficients.size
    progress.stage("profiling", 2 * p)
    independent = model.grouping is None
    limits = profile_limits(model, np.eye(p), told=progress.advance)
    found = coefficients(model, limits, crude(model, kept))
    tests = term_tests(model)
    progress.stage("checking")
    checks = run_checks(model, progress, flow=prepared.flow)
    adjusted = bool(model.adjustment) or len(model.exposures) > 1
    findings = (
        *fitted.findings,
        *of_method(model, prepared),
        *near_the_edge(model, found),
        *common_outcome(model),
        *adjustment_findings(plan.study.design, adjusted),
    )
    averages, not_averaged = _averages(model, plan)
    findings = (*findings, *not_averaged)
    scores = {name: column.scores for name, column in plan.columns.items() if column.scores is not None}
    over_levels = trends(model, prepared.section.trend, scores)
    changed = (crude_to_adjusted_table(model, found, averages),) if adjusted else ()
    tables = (
        levels(model, found, averages),
        *changed,
        *(two_by_two_tables(model) if independent else ()),
        *(trend_table(model, one, found) for one in over_levels),
        *corrected_intercepts(model),
    )
    figures = (flow_figure(prepared), estimates_figure(model, in_answer(found, averages), prepared.id))
    result = model_result(prepared, fitted, plan, columns, found, findings, tables, figures)
    certified = CertificateResult(None, None)
    reasons = {} if independent else dict.fromkeys(LIKELIHOODS, say("no-log-likelihood-of-grouped-records"))
    if certificate is not None:
        certified = CertificateResult(float(certificate.digits.min()), certificate.condition_number)
    else:
        reasons["certificate"] = say("no-certificate-of-method")
    return replace(
        result,
        log_likelihood=_log_likelihood(model) if independent else None,
        null_log_likelihood=tests.null_log_likelihood,
        reasons=reasons,
        groups=None if model.grouping is None else model.grouping.number,
        grouped_by=None if model.grouping is None else model.grouping.label,
        terms=tests.tests,
        checks=checks,
        certificate=certified,
        trends=over_levels,
        averages=averages,
    )


def without_maximum(
    prepared: Prepared,
    fitted: Fitted,
    plan: StudyPlan,
    columns: Mapping[str, Column],
    kept: People,
    progress: Progress,
) -> ModelResult:
    """A model whose records are separated, or one by exact inference: estimates, counts and what is checked of any
    model, but no tests of terms."""
    model = fitted.described
    assert model is not None
    alone = crude(model, kept)
    if fitted.separated is not None and model.method != "exact":
        found = separated_coefficients(model, fitted.separated, alone)
        status, findings = fitted.status, fitted.findings
        heights = fitted.separated.part.log_likelihood, null_log_likelihood(model)
        reasons = {"certificate": say("no-certificate-without-maximum")}
        withheld = "separated-no-tests"
    else:
        exact = exact_coefficients(model, alone, progress)
        found, heights = exact.coefficients, (None, None)
        reasons = dict.fromkeys(LIKELIHOODS, say("exact-no-likelihood"))
        reasons["certificate"] = say("no-certificate-of-method")
        withheld = "exact-no-tests"
        if exact.refused is not None:
            findings = (*prepared.findings, exact.refused)
            result = model_result(prepared, fitted, plan, columns, findings=findings)
            return replace(result, status="not estimated", reasons=reasons)
        status, findings = "converged", (*prepared.findings, *of_method(model, prepared))
    adjusted = bool(model.adjustment) or len(model.exposures) > 1
    findings = (
        *findings,
        *common_outcome(model),
        *adjustment_findings(plan.study.design, adjusted),
        *_averages_withheld(model, plan, withheld),
    )
    changed = (crude_to_adjusted_table(model, found),) if adjusted else ()
    tables = (levels(model, found), *changed, *two_by_two_tables(model))
    figures = (flow_figure(prepared), estimates_figure(model, in_answer(found, ()), prepared.id))
    result = model_result(prepared, fitted, plan, columns, found, findings, tables, figures)
    progress.stage("checking")
    return replace(
        result,
        status=status,
        log_likelihood=heights[0],
        null_log_likelihood=heights[1],
        reasons=reasons,
        checks=run_checks(model, progress, flow=prepared.flow),
        trends=trends_withheld(model, prepared.section.trend, say(withheld)),
    )


def _log_likelihood(model: FittedModel) -> float:
    """At the estimates, without the penalty or the prior."""
    if model.method == "maximum likelihood":
        return model.fit.log_likelihood
    return float(model.binomial.evaluate(model.fit.coefficients[None, :], information=False).log_likelihood[0])


def _averages(model: FittedModel, plan: StudyPlan) -> tuple[tuple[CoefficientResult, ...], tuple[Finding, ...]]:
    """The levels of exposures that the plan compares with their average, and a word where that cannot be done."""
    found: list[CoefficientResult] = []
    told: list[Finding] = []
    for name in model.exposures:
        column = plan.columns.get(name)
        if column is not None and column.compare_with == "network average":
            against = network_average(model, name)
            found.extend(against)
            if not against:
                told.append(finding("caution", "average-not-plain-levels", label=model.columns[name].label))
    return tuple(found), tuple(told)


def _averages_withheld(model: FittedModel, plan: StudyPlan, code: str) -> tuple[Finding, ...]:
    """A word where levels should have been compared with their average, but this model has no such contrast."""
    asked = [name for name in model.exposures if name in plan.columns]
    return tuple(
        finding("caution", "average-without-contrast", label=model.columns[name].label, reason=say(code))
        for name in asked
        if plan.columns[name].compare_with == "network average"
    )


def model_result(
    prepared: Prepared,
    fitted: Fitted,
    plan: StudyPlan,
    columns: Mapping[str, Column],
    found: tuple[CoefficientResult, ...] = (),
    findings: tuple[Finding, ...] | None = None,
    tables: tuple[Table, ...] = (),
    figures: tuple[Figure, ...] | None = None,
) -> ModelResult:
    section, flow = prepared.section, prepared.flow
    covariance = "model" if plan.records.grouped_by is None else "cluster-robust"
    label = {name: columns[name].label for name in (*prepared.exposures, *prepared.adjustment)}
    return ModelResult(
        id=prepared.id,
        name=section.name,
        formula=prepared.formula.text,
        method=section.method or "maximum likelihood",
        added_by_program=prepared.added,
        variant={"outcome": plan.outcome.column_name, "missing": COMPLETE, "covariance": covariance},
        role=section.role or ("main" if prepared.id == "model-1" else "secondary"),
        why=section.why,
        level=section.level,
        status=fitted.status,
        exposures=prepared.exposures,
        exposure_labels=tuple(label[name] for name in prepared.exposures),
        adjustment=prepared.adjustment,
        adjustment_labels=tuple(label[name] for name in prepared.adjustment),
        flow=flow,
        records=flow.analysed,
        events=flow.events,
        patterns=fitted.rows,
        parameters=0 if prepared.design is None else len(prepared.design.columns),
        log_likelihood=None,
        null_log_likelihood=None,
        coefficients=found,
        terms=(),
        checks=(),
        certificate=CertificateResult(None, None),
        findings=fitted.findings if findings is None else findings,
        tables=tables,
        figures=(flow_figure(prepared),) if figures is None else figures,
        based_on=section.based_on,
        differs=prepared.differs,
        planned=section.planned,
    )
