"""From a file or a data frame to coded records; every fault of the plan against them is reported together."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd

from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ColumnSection, Kind, StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.coding import WITH_LEVELS, CodedColumn, RawValues, Use, code_column
from oddsmodel.records.condition import vet_condition
from oddsmodel.records.counts import faults_of_counts
from oddsmodel.records.derived import derive
from oddsmodel.records.derived.making import place
from oddsmodel.records.faults import fault, in_column, in_plan
from oddsmodel.records.groups import faults_of_groups, without_group
from oddsmodel.records.made_outcome import MadeOutcome, Table, make_outcome
from oddsmodel.records.mentions import is_mentioned
from oddsmodel.records.outcome import code_outcome
from oddsmodel.records.plausible import implausible_finding
from oddsmodel.records.raw import RawTable
from oddsmodel.records.renamed import file_name, renamed
from oddsmodel.records.repeats import repeats_left_out
from oddsmodel.records.source import read_table, table_from_frame
from oddsmodel.records.source_database import read_database
from oddsmodel.records.types import Column, LeftOut, Records
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

AS_WRITTEN = (*WITH_LEVELS, "identifier", "date")


def load_records(path: Path, plan: StudyPlan, progress: Progress) -> Records:
    """The records of a file, coded as the plan says.

    Raises: InputFault with all faults of the file, or, where it can be read, of the plan against its records.
    """
    progress.stage("reading")
    wide = set(plan.records.not_recorded)
    roles = kinds_by_role(plan)
    as_written = [
        name
        for name, section in plan.columns.items()
        if section.kind in AS_WRITTEN
        or name in roles
        or section.levels is not None
        or section.reference is not None
        or (section.not_recorded is not None and not wide - {""} <= set(section.not_recorded))
    ]
    as_written += [name for name in roles if name not in plan.columns]
    grouped = [one.groups_of for one in plan.derived.values() if one.groups_of is not None]
    as_written += [name for name in grouped if name not in plan.columns]
    in_file = [file_name(name, plan) for name in as_written]
    table = read_table(path, text_columns=in_file, not_recorded=plan.records.not_recorded)
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


def columns_used(plan: StudyPlan, names: Iterable[str]) -> set[str]:
    """The columns that the plan has a use for: named by a key, or met in a formula or in a condition."""
    used = {plan.outcome.column, *plan.outcome.dates, *plan.columns}
    used.update(source for section in plan.derived.values() for source in section.sources)
    texts = [text for model in plan.models for text in (model.formula, *model.add)]
    if plan.outcome.event_when is not None:
        texts.append(plan.outcome.event_when)
    texts += [keep for keep in (plan.records.keep, *(model.keep for model in plan.models)) if keep is not None]
    for model in plan.models:
        used.update(model.exposures)
    if plan.records.count is not None:
        used.add(plan.records.count)
    return {name for name in names if name in used or any(is_mentioned(name, text) for text in texts)}


def kinds_by_role(plan: StudyPlan) -> dict[str, Kind]:
    """The kinds of columns that follow from what the plan uses them for."""
    kinds: dict[str, Kind] = dict.fromkeys(plan.outcome.dates, "date")
    for section in plan.derived.values():
        kinds.update(dict.fromkeys(section.years_between or (), "date"))
    if plan.records.repeats is not None:
        kinds.setdefault(plan.records.repeats.of, "identifier")
    if plan.records.grouped_by is not None:
        kinds.setdefault(plan.records.grouped_by, "identifier")
    return kinds


def _section(name: str, plan: StudyPlan) -> ColumnSection | None:
    """What the plan says of a column, its kind by its role where the section leaves that open."""
    section, kind = plan.columns.get(name), kinds_by_role(plan).get(name)
    if kind is None or (section is not None and (section.kind or section.levels)):
        return section
    return (section or ColumnSection()).model_copy(update={"kind": kind})


def _coded(table: RawTable, plan: StudyPlan) -> Records:
    table, faults = renamed(table, plan)
    names = list(table.frame.columns)
    used = columns_used(plan, [*names, *table.refused])
    faults.extend(_columns_missing(table, plan, used))
    coded: dict[str, CodedColumn] = {}
    for name in names:
        section = _section(name, plan)
        coded[name] = code_column(_raw_values(table, name, section, plan), section, _use(name, used, plan))
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
    faults.extend(_faults_of_conditions(plan, coded))
    if asked is not None and asked in coded and not coded[asked].faults:
        faults.extend(_faults_of_outcome(table, plan, coded, counts))
    if faults:
        raise InputFault(tuple(dict.fromkeys(faults)))
    findings = [*table.findings, *(said for column in coded.values() for said in column.findings)]
    findings.extend(_implausible(plan, coded, counts))
    findings.extend(_references_taken(plan, coded, used))
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
        findings = [one for one in findings if not _is_of_persons(one, plan.records.repeats.of)]
        findings.extend(said)
    if plan.records.grouped_by is not None:
        left_out.update(without_group(coded[plan.records.grouped_by]))
        findings = [one for one in findings if not _is_of_persons(one, plan.records.grouped_by)]
    return replace(_records(table, coded, counts, findings, left_out), derived=derived)


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
    taken = [name for name in plan.derived if name in coded or name in table.refused]
    faults.extend(fault("derived-name-taken", place(name), column=quoted(name)) for name in taken)
    weights = np.ones(len(table.frame)) if counts is None else counts.to_numpy(np.float64)
    made = derive(plan, coded, weights, lambda name: in_column(table.source, file_name(name, plan)), table.first_row)
    faults.extend(made.faults)
    coded.update(made.columns)
    for name in made.unmade:
        # What asks for the column is then not asked about: its faults are those told already.
        nothing = pd.Series(np.full(len(table.frame), np.nan))
        coded[name] = CodedColumn(nothing, Column(name, "number", name), faults=tuple(faults))
    return made.made


def _implausible(plan: StudyPlan, coded: dict[str, CodedColumn], counts: pd.Series | None) -> list[Finding]:
    """How many values were set aside as outside their plausible range, a note a column."""
    weights = None if counts is None else counts.to_numpy(np.float64)
    ranges = {name: section.plausible for name, section in plan.columns.items()}
    ranges |= {name: section.plausible for name, section in plan.derived.items()}
    return [
        implausible_finding(name, column.implausible, weights, limits)
        for name, column in coded.items()
        if column.implausible is not None and (limits := ranges.get(name)) is not None
    ]


def _is_of_persons(said: Finding, column: str) -> bool:
    """Whether it is the stop at an identifier that repeats, of the column by which persons are told apart."""
    return said.code == "identifier-repeats" and said.facts["column"] == column


def _table(table: RawTable, plan: StudyPlan, coded: dict[str, CodedColumn], counts: pd.Series | None) -> Table:
    return Table(
        frame=pd.DataFrame({name: column.values for name, column in coded.items()}, copy=False),
        columns={name: column.column for name, column in coded.items()},
        outside={name: pd.Series(column.outside) for name, column in coded.items() if column.outside is not None},
        counts=counts,
        where=lambda name: in_column(table.source, file_name(name, plan)),
        first_row=table.first_row,
    )


def _made_outcome(
    table: RawTable, plan: StudyPlan, coded: dict[str, CodedColumn], counts: pd.Series | None
) -> MadeOutcome | None:
    """The outcome that the plan makes; None where it names a column, or what it is made from is at fault itself."""
    outcome = plan.outcome
    if outcome.column is not None or any(name not in coded or coded[name].faults for name in outcome.dates):
        return None
    text = outcome.event_when or ""
    if any(column.faults and is_mentioned(name, text) for name, column in coded.items()):
        return None
    return make_outcome(_table(table, plan, coded, counts), outcome)


def _raw_values(table: RawTable, name: str, section: ColumnSection | None, plan: StudyPlan) -> RawValues:
    own = section.not_recorded if section is not None else None
    not_recorded = plan.records.not_recorded if own is None else own
    return RawValues(
        name,
        table.frame[name],
        table.types[name],
        table.source,
        table.first_row,
        not_recorded,
        file_name(name, plan),
    )


def _use(name: str, used: set[str], plan: StudyPlan) -> Use:
    if name == plan.outcome.column:
        return "outcome"
    if name == plan.records.count:
        return "count"
    return "model" if name in used else "none"


def _columns_missing(table: RawTable, plan: StudyPlan, used: set[str]) -> list[Fault]:
    """Faults for columns that the plan names and the file does not have, or that hold what cannot be coded."""
    named: dict[str, str] = {}
    for key in ("column", "start", "event_date", "followed_to"):
        if (asked := getattr(plan.outcome, key)) is not None:
            named[asked] = f"the plan, [outcome] {key}"
    if plan.records.repeats is not None:
        for asked in (plan.records.repeats.of, plan.records.repeats.ordered_by):
            named.setdefault(asked, "the plan, [records] repeats")
            used = used | {asked}
    if plan.records.count is not None:
        named.setdefault(plan.records.count, "the plan, [records] count")
    if plan.records.grouped_by is not None:
        named.setdefault(plan.records.grouped_by, "the plan, [records] grouped_by")
        used = used | {plan.records.grouped_by}
    for name in plan.columns:
        named.setdefault(name, in_plan(name, "from" if file_name(name, plan) != name else ""))
    for name, section in plan.derived.items():
        for source in section.sources:
            named.setdefault(source, place(name))
    for model in plan.models:
        for name in model.exposures:
            named.setdefault(name, f"the plan, [[models]] {quoted(model.name)} exposures")
    known = [*table.frame.columns, *table.refused, *plan.derived]
    faults = []
    for name, where in named.items():
        if name not in known:
            sought = file_name(name, plan)
            near = nearest(sought, known)
            facts = {"column": quoted(sought), "nearest": "" if near is None else quoted(near)}
            faults.append(fault("column-not-in-file", where, **facts))
    for name in sorted(used & set(table.refused)):
        where = in_column(table.source, file_name(name, plan))
        faults.append(fault("column-not-codable", where, holds=table.refused[name]))
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
        if text is None or any(column.faults and is_mentioned(name, text) for name, column in coded.items()):
            continue
        try:
            vet_condition(text, columns, where)
        except InputFault as found:
            faults.extend(found.faults)
    return faults


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


def _references_taken(plan: StudyPlan, coded: dict[str, CodedColumn], used: set[str]) -> list[Finding]:
    """One note on the references that the plan left open, among the columns that a model compares."""
    formulas = [text for model in plan.models for text in (model.formula, *model.add)]
    made_use_of = {*plan.derived, *(source for section in plan.derived.values() for source in section.sources)}
    aside = {name for name in made_use_of if not any(is_mentioned(name, text) for text in formulas)}
    open_columns = [
        column.column
        for name, column in coded.items()
        if name in used - {plan.outcome.column_name} - aside
        and column.column.kind in ("category", "ordered")
        and column.column.reference is not None
        and all(name not in of_plan or of_plan[name].reference is None for of_plan in (plan.columns, plan.derived))
    ]
    if not open_columns:
        return []
    names = [column.name for column in open_columns]
    return [finding("note", "references-taken", columns=names, levels=[column.reference for column in open_columns])]


def _records(
    table: RawTable,
    coded: dict[str, CodedColumn],
    counts: pd.Series | None,
    findings: list[Finding],
    left_out: dict[str, LeftOut],
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
            left_out = {code: replace(one, rows=one.rows[met]) for code, one in left_out.items()}
    return Records(
        frame=frame,
        columns={name: column.column for name, column in coded.items()},
        read=read,
        source=table.source,
        sha256=table.sha256,
        findings=tuple(findings),
        counts=counts,
        outside_levels=outside,
        left_out=left_out,
    )
