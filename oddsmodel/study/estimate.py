"""From a fitted model to its result: intervals, tests, crude estimates, checks, tables and pictures."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from oddsmodel.checks import run_checks
from oddsmodel.findings import Finding
from oddsmodel.inference import profile
from oddsmodel.measures.coefficients import coefficients
from oddsmodel.measures.crude import KeptRecords, crude
from oddsmodel.measures.crude_to_adjusted import adjustment_findings, crude_to_adjusted_table
from oddsmodel.measures.levels import common_outcome, levels
from oddsmodel.measures.two_by_two_table import two_by_two_tables
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.types import Records
from oddsmodel.results.figures import Figure
from oddsmodel.results.study import CertificateResult, CoefficientResult, ModelResult
from oddsmodel.results.tables import Table
from oddsmodel.study.fitting import Fitted
from oddsmodel.study.pictures import estimates_figure, flow_figure
from oddsmodel.study.prepare import Prepared
from oddsmodel.study.term_tests import term_tests

COMPLETE = "complete records"


def estimate(
    prepared: Prepared, fitted: Fitted, plan: StudyPlan, records: Records, kept: KeptRecords, progress: Progress
) -> ModelResult:
    """Everything the report says of one model; for one that could not be estimated, who was counted and why not."""
    model, certificate = fitted.model, fitted.certificate
    if model is None or certificate is None:
        return _result(prepared, fitted, plan, records)
    p = model.fit.coefficients.size
    progress.stage("profiling", 2 * p)
    limits = profile(model.fit, np.eye(p), model.level, told=progress.advance)
    found = coefficients(model, limits, crude(model, kept))
    tests = term_tests(model)
    progress.stage("checking")
    checks = run_checks(model, progress, flow=prepared.accounting.flow)
    findings = (
        *fitted.findings,
        *common_outcome(model),
        *adjustment_findings(plan.study.design, bool(model.adjustment)),
    )
    tables = (levels(model, found), crude_to_adjusted_table(model, found), *two_by_two_tables(model))
    figures = (flow_figure(prepared), estimates_figure(model, found, prepared.id))
    result = _result(prepared, fitted, plan, records, found, findings, tables, figures)
    return replace(
        result,
        log_likelihood=model.fit.log_likelihood,
        null_log_likelihood=tests.null_log_likelihood,
        terms=tests.tests,
        checks=checks,
        certificate=CertificateResult(float(certificate.digits.min()), certificate.condition_number),
    )


def _result(
    prepared: Prepared,
    fitted: Fitted,
    plan: StudyPlan,
    records: Records,
    found: tuple[CoefficientResult, ...] = (),
    findings: tuple[Finding, ...] | None = None,
    tables: tuple[Table, ...] = (),
    figures: tuple[Figure, ...] | None = None,
) -> ModelResult:
    section, flow = prepared.section, prepared.accounting.flow
    label = {name: records.columns[name].label for name in (*prepared.exposures, *prepared.adjustment)}
    return ModelResult(
        id=prepared.id,
        name=section.name,
        formula=prepared.formula.text,
        method="maximum likelihood",
        added_by_program=False,
        variant={"outcome": plan.outcome.column, "missing": COMPLETE, "covariance": "model"},
        role="main" if prepared.id == "model-1" else "secondary",
        why="",
        level=section.level,
        status=fitted.status,
        exposures=prepared.exposures,
        exposure_labels=tuple(label[name] for name in prepared.exposures),
        adjustment=prepared.adjustment,
        adjustment_labels=tuple(label[name] for name in prepared.adjustment),
        flow=flow,
        records=flow.analysed,
        events=flow.events,
        patterns=None if fitted.patterns is None else len(fitted.patterns.trials),
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
    )
