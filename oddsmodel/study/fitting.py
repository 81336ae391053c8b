"""From a prepared model to a certified fit, or to the words that say why there is none."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.design.patterns import Patterns, collapse
from oddsmodel.design.types import DesignColumn
from oddsmodel.findings import Finding
from oddsmodel.inference import Certificate, Fit, certify, maximise, separation
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.grouped import grouping
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.study.groups import findings_of_groups
from oddsmodel.study.prepare import Prepared
from oddsmodel.wording import finding

FEW_DIGITS = 6.0


@dataclass(frozen=True)
class Fitted:
    """A model with its certificate, or None for both where it could not be estimated."""

    status: str
    patterns: Patterns | None
    model: FittedModel | None
    certificate: Certificate | None
    findings: tuple[Finding, ...]


def fit_model(prepared: Prepared, plan: StudyPlan) -> Fitted:
    """Collapse, maximise, certify. A model without a finite, unique maximum comes back with its reason."""
    design = prepared.design
    if design is None:
        return Fitted("not estimated", None, None, None, prepared.findings)
    patterns = collapse(design.encode(prepared.frame), prepared.event, prepared.counts)
    single = bool((patterns.trials == 1.0).all())
    likelihood = BinomialLikelihood(patterns.X, patterns.events, trials=None if single else patterns.trials)
    fit = maximise(likelihood)
    if fit.status != "converged":
        return Fitted(fit.status, patterns, None, None, (*prepared.findings, _why_not(fit, design.columns, patterns)))
    certificate = certify(fit)
    findings = prepared.findings
    digits = float(certificate.digits.min())
    if digits < FEW_DIGITS:
        findings = (*findings, finding("caution", "few-digits", digits=int(digits)))
    grouped = None
    if plan.records.grouped_by is not None:
        grouped = grouping(
            plan.records.grouped_by,
            prepared.columns[plan.records.grouped_by].label,
            prepared.frame[plan.records.grouped_by],
            prepared.event,
            prepared.counts,
            design,
            patterns,
            certificate.fit,
        )
        findings = (*findings, *findings_of_groups(grouped, prepared.accounting.flow))
    model = FittedModel(
        name=prepared.section.name,
        study_design=plan.study.design,
        aim=plan.study.aim,
        level=prepared.section.level,
        design=design,
        frame=prepared.frame,
        columns=prepared.columns,
        event=prepared.event,
        counts=prepared.counts,
        patterns=patterns,
        likelihood=likelihood,
        fit=certificate.fit,
        exposures=prepared.exposures,
        adjustment=prepared.adjustment,
        also=plan.checks.also,
        seed=plan.run.seed,
        grouping=grouped,
    )
    return Fitted("converged", patterns, model, certificate, findings)


def _why_not(fit: Fit, columns: tuple[DesignColumn, ...], patterns: Patterns) -> Finding:
    labels = [column.label for column in columns]
    if fit.status == "aliased":
        if len(columns) > len(patterns.trials):
            return finding(
                "stop", "more-parameters-than-records", parameters=len(columns), patterns=len(patterns.trials)
            )
        relations = [
            [labels[one.column], [[weight, labels[kept]] for kept, weight in one.weights]] for one in fit.aliased
        ]
        return finding("stop", "aliased", relations=relations)
    if fit.status == "no finite maximum":
        verdict = fit.separation or separation(patterns.X, patterns.events, patterns.trials)
        told = {
            kind: [label for label, found in zip(labels, verdict.coefficients, strict=True) if found == kind]
            for kind in ("plus infinity", "minus infinity", "undetermined")
        }
        return finding(
            "stop",
            "separated",
            rising=told["plus infinity"],
            falling=told["minus infinity"],
            undetermined=told["undetermined"],
            complete=verdict.complete,
            separated_records=int(np.sum(patterns.trials[verdict.rows])),
        )
    return finding("stop", "not-converged", steps=fit.steps)
