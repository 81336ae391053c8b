"""Fit every model of a checked plan and gather the study's results."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.findings import Finding
from oddsmodel.measures.characteristics import study_characteristics
from oddsmodel.measures.compare_models import compare_models, models_figure
from oddsmodel.measures.crude import KeptRecords
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.model.fitted import FittedModel
from oddsmodel.progress import Progress, Silent
from oddsmodel.records.accounting import account
from oddsmodel.records.types import Column
from oddsmodel.results.study import AdjustmentColumn, ModelResult, RecordsResult, StudyResults
from oddsmodel.results.tables import Table
from oddsmodel.study.check import CheckedPlan
from oddsmodel.study.derived import with_counts
from oddsmodel.study.deviations import standard_deviations
from oddsmodel.study.estimate import estimate
from oddsmodel.study.fitting import Fitted, fit_model
from oddsmodel.study.follow_up import rules, with_losses
from oddsmodel.study.groups import with_groups_told
from oddsmodel.study.prepare import Prepared, conditions, on_records_of
from oddsmodel.study.provenance import provenance
from oddsmodel.wording import finding
from oddsmodel.wording.numbers import ratio


def answer(checked: CheckedPlan, progress: Progress | None = None) -> tuple[StudyResults, tuple[Fitted, ...]]:
    """The results of the whole study, internal until disclosure has seen them, and the fits they rest on."""
    progress = progress or Silent()
    plan, records, models = checked.file.plan, checked.records, checked.models
    progress.stage("fitting", len(models))
    fitted = []
    for prepared in models:
        fitted.append(fit_model(prepared, plan))
        progress.advance()
    results = []
    populations: dict[tuple[str, ...], KeptRecords] = {}
    for prepared, fit in zip(models, fitted, strict=True):
        who = tuple(conditions(plan, prepared.section))
        if who not in populations:
            populations[who] = _kept(checked, _rows_kept(checked, prepared, ()))
        result = estimate(prepared, fit, plan, records, populations[who], progress)
        results.append(with_losses(result, prepared, plan, records, checked.outcome))
    differing = _records_differ(checked, tuple(fitted), tuple(results))
    main = results[0]
    used = dict.fromkeys(column for prepared in models for column in (*prepared.exposures, *prepared.adjustment))
    outcome = records.columns[plan.outcome.column_name]
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
        event=checked.outcome.event_label,
        event_share=share,
        not_measured=plan.study.not_measured,
        columns=tuple(_column(records.columns[name]) for name in used),
        records=RecordsResult(
            source=records.source, sha256=records.sha256, read=records.read, excluded=main.flow.left_out
        ),
        models=tuple(results),
        characteristics=_characteristics(checked, models[0]),
        findings=(*checked.records.findings, *differing),
        provenance=provenance(checked.file),
        rules=rules(plan, records),
        comparison=compare_models(results),
        comparison_figure=models_figure(results),
        standard_deviations=standard_deviations(models[0].columns),
        derived=with_counts(records.derived, models[0]),
    )
    return study, tuple(fitted)


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


def _rows_kept(checked: CheckedPlan, prepared: Prepared, exposures: tuple[str, ...]) -> NDArray[np.bool_]:
    """Records of the model's study population that have the outcome and the exposures named, complete or not."""
    keep = conditions(checked.file.plan, prepared.section)
    return account(checked.records, checked.outcome, keep=keep, exposures=exposures, adjustment=()).included


def _kept(checked: CheckedPlan, rows: NDArray[np.bool_]) -> KeptRecords:
    records = checked.records
    counts = None if records.counts is None else np.asarray(records.counts, dtype=np.float64)[rows]
    return KeptRecords(records.frame.loc[rows].reset_index(drop=True), checked.outcome.event[rows], counts)


def _characteristics(checked: CheckedPlan, main: Prepared) -> Table:
    rows = _rows_kept(checked, main, main.exposures)
    table = study_characteristics(
        checked.file.plan.study.design,
        _kept(checked, rows),
        checked.records.columns,
        main.exposures,
        main.adjustment,
        main.accounting.included[rows],
    )
    return with_groups_told(table, main, checked.file.plan.records.grouped_by)


def _records_differ(
    checked: CheckedPlan, fitted: tuple[Fitted, ...], results: tuple[ModelResult, ...]
) -> tuple[Finding, ...]:
    """For a model on its own records: what its exposure's odds ratio is on the records the others share."""
    sharing = [prepared for prepared in checked.models if prepared.section.same_records]
    found: list[Finding] = []
    for prepared, fit, result in zip(checked.models, fitted, results, strict=True):
        if prepared.section.same_records or not sharing or fit.model is None:
            continue
        again = on_records_of(prepared, sharing[0], checked.records)
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
