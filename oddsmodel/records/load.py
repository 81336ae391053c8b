"""From a file or a data frame to coded records; every fault of the plan against them is reported together."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd

from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ColumnSection, StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.coding import WITH_LEVELS, CodedColumn, RawValues, Use, code_column
from oddsmodel.records.condition import vet_condition
from oddsmodel.records.counts import faults_of_counts
from oddsmodel.records.faults import fault, in_column, in_plan
from oddsmodel.records.outcome import code_outcome
from oddsmodel.records.raw import RawTable
from oddsmodel.records.source import read_table, table_from_frame
from oddsmodel.records.types import Records
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

AS_WRITTEN = (*WITH_LEVELS, "identifier", "date")


def load_records(path: Path, plan: StudyPlan, progress: Progress) -> Records:
    """The records of a file, coded as the plan says.

    Raises: InputFault with all faults of the file, or, where it can be read, of the plan against its records.
    """
    progress.stage("reading")
    wide = set(plan.records.not_recorded)
    as_written = [
        name
        for name, section in plan.columns.items()
        if section.kind in AS_WRITTEN
        or section.levels is not None
        or section.reference is not None
        or (section.not_recorded is not None and not wide - {""} <= set(section.not_recorded))
    ]
    table = read_table(path, text_columns=as_written, not_recorded=plan.records.not_recorded)
    return _coded(table, plan)


def records_from_frame(frame: pd.DataFrame, plan: StudyPlan) -> Records:
    """The records of a data frame, coded as the plan says. Raises InputFault as `load_records` does."""
    return _coded(table_from_frame(frame), plan)


def columns_used(plan: StudyPlan, names: Iterable[str]) -> set[str]:
    """The columns that the plan has a use for: named by a key, or met in a formula or in a condition."""
    used = {plan.outcome.column, *plan.columns}
    texts = [model.formula for model in plan.models]
    texts += [keep for keep in (plan.records.keep, *(model.keep for model in plan.models)) if keep is not None]
    for model in plan.models:
        used.update(model.exposures)
    if plan.records.count is not None:
        used.add(plan.records.count)
    return {name for name in names if name in used or any(_is_met(name, text) for text in texts)}


def _is_met(name: str, text: str) -> bool:
    if not name.isidentifier():
        return name in text
    return re.search(rf"(?<![\w.]){re.escape(name)}(?!\w|\s*\()", text) is not None


def _coded(table: RawTable, plan: StudyPlan) -> Records:
    names = list(table.frame.columns)
    used = columns_used(plan, [*names, *table.refused])
    faults = _columns_missing(table, plan, used)
    coded: dict[str, CodedColumn] = {}
    for name in names:
        section = plan.columns.get(name)
        coded[name] = code_column(_raw_values(table, name, section, plan), section, _use(name, used, plan))
    outcome = coded.get(plan.outcome.column)
    if outcome is not None and plan.outcome.label is not None:
        labelled = replace(outcome.column, label=plan.outcome.label)
        coded[plan.outcome.column] = replace(outcome, column=labelled)
    for column in coded.values():
        faults.extend(column.faults)
    counts, count_faults = _counts(table, plan, coded)
    faults.extend(count_faults)
    faults.extend(_faults_of_conditions(plan, coded))
    if plan.outcome.column in coded and not coded[plan.outcome.column].faults:
        faults.extend(_faults_of_outcome(table, plan, coded, counts))
    if faults:
        raise InputFault(faults)
    findings = [*table.findings, *(said for column in coded.values() for said in column.findings)]
    findings.extend(_references_taken(plan, coded, used))
    return _records(table, coded, counts, findings)


def _raw_values(table: RawTable, name: str, section: ColumnSection | None, plan: StudyPlan) -> RawValues:
    own = section.not_recorded if section is not None else None
    not_recorded = plan.records.not_recorded if own is None else own
    return RawValues(name, table.frame[name], table.types[name], table.source, table.first_row, not_recorded)


def _use(name: str, used: set[str], plan: StudyPlan) -> Use:
    if name == plan.outcome.column:
        return "outcome"
    if name == plan.records.count:
        return "count"
    return "model" if name in used else "none"


def _columns_missing(table: RawTable, plan: StudyPlan, used: set[str]) -> list[Fault]:
    """Faults for columns that the plan names and the file does not have, or that hold what cannot be coded."""
    named: dict[str, str] = {plan.outcome.column: "the plan, [outcome] column"}
    if plan.records.count is not None:
        named.setdefault(plan.records.count, "the plan, [records] count")
    for name in plan.columns:
        named.setdefault(name, in_plan(name))
    for model in plan.models:
        for name in model.exposures:
            named.setdefault(name, f"the plan, [[models]] {quoted(model.name)} exposures")
    known = [*table.frame.columns, *table.refused]
    faults = []
    for name, where in named.items():
        if name not in known:
            near = nearest(name, known)
            facts = {"column": quoted(name), "nearest": "" if near is None else quoted(near)}
            faults.append(fault("column-not-in-file", where, **facts))
    for name in sorted(used & set(table.refused)):
        faults.append(fault("column-not-codable", in_column(table.source, name), holds=table.refused[name]))
    return faults


def _counts(table: RawTable, plan: StudyPlan, coded: dict[str, CodedColumn]) -> tuple[pd.Series | None, list[Fault]]:
    """The counts (n,) of grouped records, where there are any and they are in order; else why they are not."""
    name = plan.records.count
    if name is None or name not in coded or coded[name].faults:
        return None, []
    where = in_column(table.source, name)
    if coded[name].column.kind != "number":
        return None, [fault("count-not-number", where)]
    counts = coded[name].values
    faults = faults_of_counts(counts.to_numpy(np.float64), where=where, first_row=table.first_row)
    return (None if faults else counts), faults


def _faults_of_conditions(plan: StudyPlan, coded: dict[str, CodedColumn]) -> list[Fault]:
    """Faults of every `keep`, told where no column it could use is itself at fault."""
    columns = {name: column.column for name, column in coded.items()}
    conditions = [(plan.records.keep, "the plan, [records] keep")]
    conditions += [(model.keep, f"the plan, [[models]] {quoted(model.name)} keep") for model in plan.models]
    faults: list[Fault] = []
    for text, where in conditions:
        if text is None or any(column.faults and _is_met(name, text) for name, column in coded.items()):
            continue
        try:
            vet_condition(text, columns, where)
        except InputFault as found:
            faults.extend(found.faults)
    return faults


def _faults_of_outcome(
    table: RawTable, plan: StudyPlan, coded: dict[str, CodedColumn], counts: pd.Series | None
) -> list[Fault]:
    name = plan.outcome.column
    frame = pd.DataFrame({name: coded[name].values})
    columns = {name: coded[name].column}
    try:
        code_outcome(Records(frame, columns, len(frame), table.source, table.sha256, counts=counts), plan.outcome)
    except InputFault as found:
        return list(found.faults)
    return []


def _references_taken(plan: StudyPlan, coded: dict[str, CodedColumn], used: set[str]) -> list[Finding]:
    """One note on the references that the plan left open."""
    open_columns = [
        column.column
        for name, column in coded.items()
        if name in used - {plan.outcome.column}
        and column.column.kind in ("category", "ordered")
        and column.column.reference is not None
        and (name not in plan.columns or plan.columns[name].reference is None)
    ]
    if not open_columns:
        return []
    names = [column.name for column in open_columns]
    return [finding("note", "references-taken", columns=names, levels=[column.reference for column in open_columns])]


def _records(
    table: RawTable, coded: dict[str, CodedColumn], counts: pd.Series | None, findings: list[Finding]
) -> Records:
    """The coded columns as records; rows that stand for no record are dropped."""
    frame = pd.DataFrame({name: column.values for name, column in coded.items()}, copy=False)
    outside = {name: pd.Series(column.outside) for name, column in coded.items() if column.outside is not None}
    read = len(frame)
    if counts is not None:
        read = int(counts.sum())
        met = counts.to_numpy(np.float64) > 0
        if not met.all():
            findings.append(finding("note", "rows-of-no-record", zeros=int((~met).sum())))
            frame = frame.loc[met].reset_index(drop=True)
            counts = counts.loc[met].reset_index(drop=True)
            outside = {name: mask.loc[met].reset_index(drop=True) for name, mask in outside.items()}
    return Records(
        frame=frame,
        columns={name: column.column for name, column in coded.items()},
        read=read,
        source=table.source,
        sha256=table.sha256,
        findings=tuple(findings),
        counts=counts,
        outside_levels=outside,
    )
