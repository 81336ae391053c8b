"""Fit every model of a checked plan and gather the study's results."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from oddsmodel.findings import Finding
from oddsmodel.measures.compare_models import compare_models, models_figure
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.kept import People
from oddsmodel.progress import Progress, Silent
from oddsmodel.records.types import Column
from oddsmodel.results.study import AdjustmentColumn, ModelResult, RecordsResult, StudyResults
from oddsmodel.study.check import CheckedPlan
from oddsmodel.study.deviations import standard_deviations
from oddsmodel.study.estimate import estimate
from oddsmodel.study.fitting import Fitted, fit_model
from oddsmodel.study.follow_up import rules, with_losses
from oddsmodel.study.prepare import Prepared, conditions
from oddsmodel.study.provenance import provenance
from oddsmodel.wording import finding, say
from oddsmodel.wording.numbers import ratio


def answer(checked: CheckedPlan, progress: Progress | None = None) -> tuple[StudyResults, tuple[Fitted, ...]]:
    """The results of the whole study, internal until disclosure has seen them, and the fits they rest on."""
    progress = progress or Silent()
    plan, data, models = checked.file.plan, checked.data, checked.models
    progress.stage("fitting", len(models))
    fitted: list[Fitted] = []
    asked, models = models, ()
    for prepared in asked:
        found = fit_model(prepared, plan)
        companion = _penalised_beside(prepared, found)
        if companion is None:
            models, fitted = (*models, prepared), [*fitted, found]
        else:
            told = finding("caution", "penalised-added", name=companion.section.name)
            models = (*models, prepared, companion)
            fitted += [replace(found, findings=(*found.findings, told)), fit_model(companion, plan)]
        progress.advance()
    results = []
    populations: dict[tuple[str, ...], People] = {}
    for prepared, fit in zip(models, fitted, strict=True):
        who = tuple(conditions(plan, prepared.section))
        if who not in populations:
            populations[who] = data.kept(prepared)
        result = estimate(prepared, fit, plan, data.columns, populations[who], progress)
        results.append(with_losses(result, prepared, plan, data))
    differing = _records_differ(checked, models, tuple(fitted), tuple(results))
    main = results[0]
    used = dict.fromkeys(column for prepared in models for column in (*prepared.exposures, *prepared.adjustment))
    outcome = data.columns[plan.outcome.column_name]
    comparable = plan.study.design not in CASE_CONTROL
    share = main.events / main.records if comparable and main.records and main.events is not None else None
    study = StudyResults(
        title=plan.study.title,
        question=plan.study.question,
        design=plan.study.design,
        aim=plan.study.aim,
        audience=plan.report.audience,
        outcome=plan.outcome.column_name,
        outcome_label=outcome.label,
        event=data.event_label,
        event_share=share,
        not_measured=plan.study.not_measured,
        columns=tuple(_column(data.columns[name]) for name in used),
        records=RecordsResult(source=data.source, sha256=data.sha256, read=data.read, excluded=main.flow.left_out),
        models=tuple(results),
        characteristics=data.characteristics(models[0]),
        findings=(*data.findings, *differing),
        provenance=provenance(checked.file),
        rules=rules(plan, data.columns),
        comparison=compare_models(results),
        comparison_figure=models_figure(results),
        standard_deviations=standard_deviations(models[0].columns),
        derived=data.derived(models[0]),
    )
    return study, tuple(fitted)


def _penalised_beside(prepared: Prepared, found: Fitted) -> Prepared | None:
    """The same model by penalised likelihood, where the plan named no method and maximum likelihood has no answer.

    None for records that belong to groups, which have no likelihood to penalise.
    """
    if found.separated is None or prepared.section.method is not None:
        return None
    name = say("penalised-name", name=prepared.section.name)
    changes = {"name": name, "method": "penalised", "based_on": prepared.section.name, "trend": ()}
    return replace(
        prepared,
        section=prepared.section.model_copy(update=changes),
        id=f"{prepared.id}-penalised",
        differs=say("differs-penalised"),
        added=True,
    )


def _column(column: Column) -> AdjustmentColumn:
    return AdjustmentColumn(
        column.name,
        column.label,
        column.timing,
        column.why,
        kind=column.kind,
        units=column.units,
        per=column.per,
        levels=column.levels,
        reference=column.reference,
    )


def _records_differ(
    checked: CheckedPlan, models: tuple[Prepared, ...], fitted: tuple[Fitted, ...], results: tuple[ModelResult, ...]
) -> tuple[Finding, ...]:
    """For a model on its own records: what its exposure's odds ratio is on the records the others share."""
    sharing = [prepared for prepared in checked.models if prepared.section.same_records]
    found: list[Finding] = []
    for prepared, fit, result in zip(models, fitted, results, strict=True):
        if prepared.added or prepared.section.same_records or not sharing or fit.model is None:
            continue
        again = checked.data.on_records_of(prepared, sharing[0])
        other = fit_model(again, checked.file.plan).model if again is not None else None
        if other is None or other.records == fit.model.records:
            continue
        found.extend(_difference(result, fit.model, other))
    return tuple(found)


def _difference(result: ModelResult, own: FittedModel, shared: FittedModel) -> list[Finding]:
    places = {column.name: position for position, column in enumerate(shared.design.columns)}
    told = []
    for position, column in enumerate(own.design.columns):
        if column.role == "exposure" and column.shown and column.name in places:
            values = [
                float(np.exp(model.fit.coefficients[place] * column.per))
                for model, place in ((own, position), (shared, places[column.name]))
            ]
            told.append(
                finding(
                    "note",
                    "records-differ",
                    model=result.name,
                    label=column.label,
                    own=ratio(values[0]),
                    shared=ratio(values[1]),
                )
            )
    return told
