"""From a prepared model to a certified fit, or to the words that say why there is none."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.design.encoder import Design
from oddsmodel.design.types import DesignColumn
from oddsmodel.findings import Finding
from oddsmodel.inference import Certificate, Fit, certify, maximise, separation
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model.counted import CountedPeople
from oddsmodel.model.fitted import FittedModel, Held
from oddsmodel.model.grouped import grouping
from oddsmodel.model.in_memory import rows_in_memory, rows_with_index
from oddsmodel.model.kept import KeptRecords, People
from oddsmodel.model.rows import ModelRows, rows_of
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.study.groups import findings_of_groups
from oddsmodel.study.prepare import Prepared
from oddsmodel.wording import finding

FEW_DIGITS = 6.0


@dataclass(frozen=True)
class Fitted:
    """A model with its certificate, or None for both where it could not be estimated.

    rows: of the model matrix, None where there is no matrix.
    """

    status: str
    rows: int | None
    model: FittedModel | None
    certificate: Certificate | None
    findings: tuple[Finding, ...]


def fit_model(prepared: Prepared, plan: StudyPlan) -> Fitted:
    """Collapse, maximise, certify. A model without a finite, unique maximum comes back with its reason."""
    design = prepared.design
    if design is None:
        return Fitted("not estimated", None, None, None, prepared.findings)
    rows, people, held = _rows(prepared, plan, design)
    likelihood = BinomialLikelihood.over(rows.passes, len(design.columns))
    fit = maximise(likelihood)
    if fit.status != "converged":
        return Fitted(fit.status, rows.number, None, None, (*prepared.findings, _why_not(fit, design.columns, rows)))
    certificate = certify(fit)
    findings = prepared.findings
    digits = float(certificate.digits.min())
    if digits < FEW_DIGITS:
        findings = (*findings, finding("caution", "few-digits", digits=int(digits)))
    grouped = None
    if plan.records.grouped_by is not None and held is not None and held.patterns is not None:
        name = plan.records.grouped_by
        label = prepared.columns[name].label
        grouped = grouping(
            name, label, held.frame[name], held.event, held.counts, design, held.patterns, certificate.fit
        )
        findings = (*findings, *findings_of_groups(grouped, prepared.flow))
    model = FittedModel(
        name=prepared.section.name,
        study_design=plan.study.design,
        aim=plan.study.aim,
        level=prepared.section.level,
        design=design,
        columns=prepared.columns,
        rows=rows,
        people=people,
        records=prepared.flow.analysed or 0,
        events=prepared.flow.events or 0,
        likelihood=likelihood,
        fit=certificate.fit,
        exposures=prepared.exposures,
        adjustment=prepared.adjustment,
        also=plan.checks.also,
        seed=plan.run.seed,
        grouping=grouped,
        held=held,
    )
    return Fitted("converged", rows.number, model, certificate, findings)


def _rows(prepared: Prepared, plan: StudyPlan, design: Design) -> tuple[ModelRows, People, Held | None]:
    """The rows of the model matrix and the records they stand for, in memory or not."""
    if prepared.people is not None:
        people = CountedPeople(prepared.people, prepared.levels)
        return rows_of(prepared.people, design, prepared.levels), people, None
    held = prepared.in_memory
    data = (held.frame, held.event, held.counts)
    if plan.records.grouped_by is None:
        return rows_in_memory(*data, design, prepared.formula.columns), KeptRecords(*data), Held(*data)
    rows, patterns = rows_with_index(*data, design, prepared.formula.columns)
    return rows, KeptRecords(*data), Held(*data, patterns)


def _why_not(fit: Fit, columns: tuple[DesignColumn, ...], rows: ModelRows) -> Finding:
    labels = [column.label for column in columns]
    if fit.status == "aliased":
        if len(columns) > rows.number:
            return finding("stop", "more-parameters-than-records", parameters=len(columns), patterns=rows.number)
        relations = [
            [labels[one.column], [[weight, labels[kept]] for kept, weight in one.weights]] for one in fit.aliased
        ]
        return finding("stop", "aliased", relations=relations)
    if fit.status == "no finite maximum":
        verdict = fit.separation or separation(*fit.likelihood.rows_apart())
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
            separated_records=int(np.sum(fit.likelihood.rows_apart()[2][verdict.rows])),
        )
    return finding("stop", "not-converged", steps=fit.steps)
