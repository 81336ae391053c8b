"""From a file or a data frame to coded records; every fault of the plan against them is reported together."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.schema import ColumnSection, StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.coding import CodedColumn, RawValues, code_column
from oddsmodel.records.counts import faults_of_counts
from oddsmodel.records.derived import derive, faults_of_derived_names
from oddsmodel.records.faults import in_column
from oddsmodel.records.groups import faults_of_groups, without_group
from oddsmodel.records.made_outcome import MadeOutcome, Table, make_outcome, table_of
from oddsmodel.records.outcome import code_outcome
from oddsmodel.records.plan_use import (
    columns_missing,
    columns_used,
    faults_of_conditions,
    is_of_persons,
    kept_as_written,
    outcome_can_be_made,
    plausible_ranges,
    references_taken,
    section_of,
    use_of,
)
from oddsmodel.records.plausible import implausible_finding
from oddsmodel.records.raw import RawTable
from oddsmodel.records.renamed import file_name, renamed
from oddsmodel.records.repeats import repeats_left_out
from oddsmodel.records.rows import RowsInOrder
from oddsmodel.records.source import read_table, table_from_frame
from oddsmodel.records.source_database import read_database
from oddsmodel.records.types import LeftOut, Records
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.wording import finding


def load_records(path: Path, plan: StudyPlan, progress: Progress) -> Records:
    """The records of a file, coded as the plan says.

    Raises: InputFault with all faults of the file, or, where it can be read, of the plan against its records.
    """
    progress.stage("reading")
    table = read_table(path, text_columns=kept_as_written(plan), not_recorded=plan.records.not_recorded)
    return _coded(table, plan)


def load_from_database(folder: Path, plan: StudyPlan, progress: Progress) -> Records:
    """The records of the table or query that the plan names, coded as the plan says. folder: that of the plan.

    Raises: InputFault as `load_records` does, and for a database that is not reached or refuses.
    """
    progress.stage("reading")
    return _coded(read_database(plan.records, folder, progress), plan)


def records_from_frame(frame: pd.DataFrame, plan: StudyPlan) -> Records:
    """The records of a data frame, coded as the plan says. Raises InputFault as `load_records` does."""
    return _coded(table_from_frame(frame), plan)


def _coded(table: RawTable, plan: StudyPlan) -> Records:
    table, faults = renamed(table, plan)
    names = list(table.frame.columns)
    used = columns_used(plan, [*names, *table.refused])
    faults.extend(columns_missing(table, plan, used))
    coded: dict[str, CodedColumn] = {}
    for name in names:
        section = section_of(name, plan)
        coded[name] = code_column(_raw_values(table, name, section, plan), section, use_of(name, used, plan))
    for column in coded.values():
        faults.extend(column.faults)
    faults.extend(faults_of_groups(coded, plan.records.grouped_by))
    counts, count_faults = _counts(table, plan, coded)
    faults.extend(count_faults)
    derived = _derived(table, plan, coded, counts, faults)
    used |= set(plan.derived)
    asked = plan.outcome.column
    if asked is not None and asked in coded and plan.outcome.label is not None:
        labelled = replace(coded[asked].column, label=plan.outcome.label)
        coded[asked] = replace(coded[asked], column=labelled)
    made = None
    try:
        made = _made_outcome(table, plan, coded, counts)
    except InputFault as found:
        faults.extend(found.faults)
    if made is not None:
        coded[plan.outcome.column_name] = made.coded
    faults.extend(faults_of_conditions(plan, coded, {name: column.column for name, column in coded.items()}))
    if asked is not None and asked in coded and not coded[asked].faults:
        faults.extend(_faults_of_outcome(table, plan, coded, counts))
    if faults:
        raise InputFault(tuple(dict.fromkeys(faults)))
    findings = [*table.findings, *(said for column in coded.values() for said in column.findings)]
    findings.extend(_implausible(plan, coded, counts))
    findings.extend(references_taken(plan, coded, used))
    left_out: dict[str, LeftOut] = {}
    if made is not None:
        left_out.update(made.left_out)
        findings.extend(made.findings)
    if plan.records.repeats is not None:
        uses = {*used, plan.outcome.column_name, plan.records.repeats.ordered_by}
        single, said = repeats_left_out(
            _table(table, plan, coded, counts),
            plan.records.repeats,
            plan.records.keep,
            uses - {plan.records.repeats.of},
        )
        left_out.update(single)
        findings = [one for one in findings if not is_of_persons(one, plan.records.repeats.of)]
        findings.extend(said)
    if plan.records.grouped_by is not None:
        left_out.update(without_group(coded[plan.records.grouped_by]))
        findings = [one for one in findings if not is_of_persons(one, plan.records.grouped_by)]
    return as_records(table.source, table.sha256, coded, counts, findings, left_out, derived)


def _derived(
    table: RawTable,
    plan: StudyPlan,
    coded: dict[str, CodedColumn],
    counts: pd.Series | None,
    faults: list[Fault],
) -> tuple[DerivedColumn, ...]:
    """How the derived columns were made. They join the coded ones, and why some could not be made joins the faults."""
    if not plan.derived:
        return ()
    faults.extend(faults_of_derived_names(plan, {*coded, *table.refused}))
    weights = np.ones(len(table.frame)) if counts is None else counts.to_numpy(np.float64)
    rows = RowsInOrder(table.first_row)
    made = derive(plan, coded, weights, lambda name: in_column(table.source, file_name(name, plan)), rows)
    made.join(coded, faults, rows=len(table.frame))
    return made.made


def _implausible(plan: StudyPlan, coded: dict[str, CodedColumn], counts: pd.Series | None) -> list[Finding]:
    """How many values were set aside as outside their plausible range, a note a column."""
    ranges = plausible_ranges(plan)
    return [
        implausible_finding(name, _number_of_records(column.implausible, counts), ranges[name])
        for name, column in coded.items()
        if column.implausible is not None and name in ranges
    ]


def _number_of_records(rows: NDArray[np.bool_], counts: pd.Series | None) -> int:
    return int(rows.sum() if counts is None else counts.to_numpy(np.float64)[rows].sum())


def _table(table: RawTable, plan: StudyPlan, coded: dict[str, CodedColumn], counts: pd.Series | None) -> Table:
    rows = RowsInOrder(table.first_row)
    return table_of(coded, counts, lambda name: in_column(table.source, file_name(name, plan)), rows)


def _made_outcome(
    table: RawTable, plan: StudyPlan, coded: dict[str, CodedColumn], counts: pd.Series | None
) -> MadeOutcome | None:
    """The outcome that the plan makes; None where it names a column, or what it is made from is at fault itself."""
    if not outcome_can_be_made(plan, coded):
        return None
    return make_outcome(_table(table, plan, coded, counts), plan.outcome)


def _raw_values(table: RawTable, name: str, section: ColumnSection | None, plan: StudyPlan) -> RawValues:
    own = section.not_recorded if section is not None else None
    not_recorded = plan.records.not_recorded if own is None else own
    return RawValues(
        name,
        table.frame[name],
        table.types[name],
        table.source,
        RowsInOrder(table.first_row),
        not_recorded,
        file_name(name, plan),
    )


def _counts(table: RawTable, plan: StudyPlan, coded: dict[str, CodedColumn]) -> tuple[pd.Series | None, list[Fault]]:
    """The counts (n,) of grouped records, where there are any and they are in order; else why they are not."""
    name = plan.records.count
    if name is None or name not in coded or coded[name].faults:
        return None, []
    where = in_column(table.source, name)
    faults = faults_of_counts(coded[name], where=where, rows=RowsInOrder(table.first_row))
    return (None if faults else coded[name].values), faults


def _faults_of_outcome(
    table: RawTable, plan: StudyPlan, coded: dict[str, CodedColumn], counts: pd.Series | None
) -> list[Fault]:
    name = plan.outcome.column_name
    frame = pd.DataFrame({name: coded[name].values})
    columns = {name: coded[name].column}
    try:
        code_outcome(Records(frame, columns, len(frame), table.source, table.sha256, counts=counts), plan.outcome)
    except InputFault as found:
        return list(found.faults)
    return []


def as_records(
    source: str,
    sha256: str,
    coded: Mapping[str, CodedColumn],
    counts: pd.Series | None,
    findings: Sequence[Finding],
    left_out: Mapping[str, LeftOut],
    derived: tuple[DerivedColumn, ...],
) -> Records:
    """The coded columns as records; rows that stand for no record are dropped, which joins the findings."""
    frame = pd.DataFrame({name: column.values for name, column in coded.items()}, copy=False)
    outside = {name: pd.Series(column.outside) for name, column in coded.items() if column.outside is not None}
    read = len(frame)
    if counts is not None:
        read = int(counts.sum())
        met = counts.to_numpy(np.float64) > 0
        if not met.all():
            findings = [*findings, finding("note", "rows-of-no-record", zeros=int((~met).sum()))]
            frame = frame.loc[met].reset_index(drop=True)
            counts = counts.loc[met].reset_index(drop=True)
            outside = {name: mask.loc[met].reset_index(drop=True) for name, mask in outside.items()}
            left_out = {code: replace(one, rows=one.rows[met]) for code, one in left_out.items()}
    return Records(
        frame=frame,
        columns={name: column.column for name, column in coded.items()},
        read=read,
        source=source,
        sha256=sha256,
        findings=tuple(findings),
        counts=counts,
        outside_levels=outside,
        left_out=left_out,
        derived=derived,
    )
