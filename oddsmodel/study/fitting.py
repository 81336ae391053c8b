"""From a prepared model to a certified fit, or to the words that say why there is none."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

from oddsmodel.design.encoder import Design
from oddsmodel.design.types import DesignColumn
from oddsmodel.findings import Finding
from oddsmodel.inference import (
    Certificate,
    FinitePart,
    Fit,
    Separation,
    certify,
    finite_part,
    maximise,
    separation_of,
)
from oddsmodel.inference.penalised import maximise_penalised
from oddsmodel.likelihood import BinomialLikelihood, JeffreysPenalisedLikelihood
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.model.counted import CountedPeople
from oddsmodel.model.fitted import FittedModel, Held
from oddsmodel.model.grouped import grouping
from oddsmodel.model.in_memory import rows_in_memory, rows_with_index
from oddsmodel.model.kept import KeptRecords, People
from oddsmodel.model.rows import ModelRows, rows_of
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.study.groups import findings_of_groups
from oddsmodel.study.pattern import pattern_of
from oddsmodel.study.prepare import Prepared
from oddsmodel.study.priors import with_prior
from oddsmodel.wording import finding

FEW_DIGITS = 6.0


@dataclass(frozen=True)
class Separated:
    """Records that are separated: the proof, and what is left to estimate."""

    verdict: Separation
    part: FinitePart


@dataclass(frozen=True)
class Fitted:
    """A model with its certificate, or None for both where it could not be estimated.

    rows: of the model matrix, None where there is no matrix. described: the model with whatever fit there is, for what
    is counted among its records; separated: why it has no finite maximum.
    """

    status: str
    rows: int | None
    model: FittedModel | None
    certificate: Certificate | None
    findings: tuple[Finding, ...]
    described: FittedModel | None = None
    separated: Separated | None = None


def fit_model(prepared: Prepared, plan: StudyPlan) -> Fitted:
    """Collapse, maximise, certify. A model without a finite, unique maximum comes back with its reason."""
    design = prepared.design
    if design is None:
        return Fitted("not estimated", None, None, None, prepared.findings)
    rows, people, held = _rows(prepared, plan, design)
    binomial = BinomialLikelihood.over(rows.passes, len(design.columns))
    method = prepared.section.method or "maximum likelihood"
    base = partial(
        FittedModel,
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
        exposures=prepared.exposures,
        adjustment=prepared.adjustment,
        also=plan.checks.also,
        seed=plan.run.seed,
        held=held,
        method=method,
    )
    if method in ("penalised", "log-F"):
        return _by_penalty(prepared, base, design, rows)
    fit = maximise(binomial)
    described = base(likelihood=binomial, fit=fit)
    if fit.status == "no finite maximum":
        verdict = fit.separation or separation_of(binomial)
        grouped_by = plan.records.grouped_by is not None
        told = (*prepared.findings, _why_separated(described, verdict, limits=not grouped_by))
        # records of groups have no likelihood, so that neither limits nor finite standard errors can be told
        left = None if grouped_by else Separated(verdict, finite_part(binomial, verdict))
        return Fitted(fit.status, rows.number, None, None, told, described, left)
    if fit.status != "converged":
        return _not_fitted(prepared, fit, described)
    certificate = certify(fit)
    findings = (*prepared.findings, *_few_digits(certificate))
    grouped = None
    if plan.records.grouped_by is not None and held is not None and held.patterns is not None:
        name = plan.records.grouped_by
        label = prepared.columns[name].label
        grouped = grouping(
            name, label, held.frame[name], held.event, held.counts, design, held.patterns, certificate.fit
        )
        findings = (*findings, *findings_of_groups(grouped, prepared.flow))
    model = base(likelihood=binomial, fit=certificate.fit, grouping=grouped)
    return Fitted("converged", rows.number, model, certificate, findings, model)


def _by_penalty(prepared: Prepared, base: Callable[..., FittedModel], design: Design, rows: ModelRows) -> Fitted:
    """By Jeffreys' penalty or by log-F priors."""
    binomial = BinomialLikelihood.over(rows.passes, len(design.columns))
    if prepared.section.prior is not None:
        prior = with_prior(binomial, prepared.section.prior, design)
        fit = maximise(prior)
        described = base(likelihood=prior, fit=fit)
        if fit.status == "no finite maximum":
            told = _why_separated(described, fit.separation or separation_of(prior), limits=False)
            return Fitted(fit.status, rows.number, None, None, (*prepared.findings, told), described)
        if fit.status != "converged":
            return _not_fitted(prepared, fit, described)
        certificate = certify(fit)
        model = base(likelihood=prior, fit=certificate.fit)
        findings = (*prepared.findings, *_few_digits(certificate))
        return Fitted("converged", rows.number, model, certificate, findings, model)
    penalty = JeffreysPenalisedLikelihood(binomial)
    penalised = maximise_penalised(penalty)
    model = base(likelihood=penalty, fit=penalised.fit, penalised=penalised)
    if penalised.fit.status != "converged":
        return _not_fitted(prepared, penalised.fit, model)
    findings = prepared.findings
    if penalised.lower_maximum is not None:
        findings = (*findings, finding("caution", "penalised-second-maximum"))
    return Fitted("converged", rows.number, model, None, findings, model)


def _few_digits(certificate: Certificate) -> tuple[Finding, ...]:
    digits = float(certificate.digits.min())
    return (finding("caution", "few-digits", digits=int(digits)),) if digits < FEW_DIGITS else ()


def _not_fitted(prepared: Prepared, fit: Fit, described: FittedModel) -> Fitted:
    findings = (*prepared.findings, _why_not(fit, described.design.columns, described.rows))
    return Fitted(fit.status, described.rows.number, None, None, findings, described)


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
    return finding("stop", "not-converged", steps=fit.steps)


def _why_separated(model: FittedModel, verdict: Separation, *, limits: bool) -> Finding:
    """limits: whether the limits of what has no finite estimate are told with it."""
    labels = [column.label for column in model.design.columns]
    told: dict[str, list[str]] = {
        kind: [label for label, found in zip(labels, verdict.coefficients, strict=True) if found == kind]
        for kind in ("plus infinity", "minus infinity", "undetermined")
    }
    pattern = pattern_of(model, verdict)
    return finding(
        "stop",
        "separated",
        rising=told["plus infinity"],
        falling=told["minus infinity"],
        undetermined=told["undetermined"],
        without=list(pattern.without),
        always=list(pattern.always),
        higher=list(pattern.higher),
        lower=list(pattern.lower),
        complete=verdict.complete,
        proof=verdict.inexact or "exact",
        limits=limits,
        case_control=model.study_design in CASE_CONTROL,
    )
