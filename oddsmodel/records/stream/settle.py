"""A plan settled against a surveyed source: its columns, what is to be said of them, and how blocks are coded."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np
import pandas as pd

from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.progress import Progress
from oddsmodel.records.coding import CodedColumn, RawValues, code_column, described, repeats_found
from oddsmodel.records.condition import vet_condition
from oddsmodel.records.counts import faults_of_counts
from oddsmodel.records.dates import orders_of_dates, parse_dates
from oddsmodel.records.derived import faults_of_derived_names
from oddsmodel.records.event_when import WHERE
from oddsmodel.records.faults import fault, in_column
from oddsmodel.records.follow_up import Days
from oddsmodel.records.groups import faults_of_groups
from oddsmodel.records.kinds import kind_by_plan
from oddsmodel.records.made_outcome import (
    Table,
    column_of_outcome,
    faults_of_one_value,
    follow_up_of,
    reasons_told,
    refuse_taken_name,
    told_of_late_events,
)
from oddsmodel.records.outcome import CodedOutcome, code_outcome
from oddsmodel.records.plan_use import (
    columns_in_use,
    columns_missing,
    columns_used,
    faults_of_conditions,
    is_of_persons,
    outcome_can_be_made,
    plausible_ranges,
    references_taken,
    section_of,
    use_of,
)
from oddsmodel.records.plausible import implausible_finding
from oddsmodel.records.raw import RawTable
from oddsmodel.records.renamed import file_name
from oddsmodel.records.rows import Rows, RowsInOrder
from oddsmodel.records.source import told_of_columns
from oddsmodel.records.stream.blocks import Blocks, row_by_row
from oddsmodel.records.stream.coder import ColumnCode
from oddsmodel.records.stream.deriving import DerivingInSmall
from oddsmodel.records.stream.miniature import Miniature
from oddsmodel.records.stream.source import Source
from oddsmodel.records.stream.together import Together, is_needed, look_together
from oddsmodel.records.types import Column, Records
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.wording import finding

BYTES_OF_A_GROUP = 200
NOTHING = pd.Series(pd.Categorical([]))


@dataclass(frozen=True)
class Settled:
    """columns, read, findings, derived: as `load_records` has them. outcome: without any row; left_out: what the
    sentences of `Records.left_out` need, by its reasons."""

    blocks: Blocks
    columns: Mapping[str, Column]
    read: int
    findings: tuple[Finding, ...]
    derived: tuple[DerivedColumn, ...]
    outcome: CodedOutcome
    left_out: Mapping[str, Mapping[str, Any]]


@dataclass
class Settling:
    """The work of settling. outline: the columns of the file by the plan's names, without rows; in_small: those that
    the plan has a use for."""

    plan: StudyPlan
    source: Source
    outline: RawTable
    in_small: Mapping[str, Miniature]
    progress: Progress
    memory: int
    faults: list[Fault]
    coded: dict[str, CodedColumn] = field(default_factory=dict)
    together: Together = field(default_factory=Together)

    def settled(self) -> Settled:
        """Everything, in the order in which `load_records` does it. Raises: InputFault with all faults."""
        plan, coded, faults = self.plan, self.coded, self.faults
        used = columns_used(plan, self.names)
        faults.extend(columns_missing(self.outline, plan, used))
        for name in self.in_small:
            coded[name] = self._column(name, used)
        faults.extend(one for column in coded.values() for one in column.faults)
        faults.extend(faults_of_groups(coded, plan.records.grouped_by))
        counts = self._counts()
        codes = self._codes()
        blocks = Blocks(self.source, codes, row_by_row(plan, {}), plan.records.count if counts is not None else None)
        if is_needed(plan) and codes:
            self.together, blocks = look_together(blocks, plan, self.progress, memory=self.memory)
        derived = self._derived()
        used |= set(plan.derived)
        self._label_outcome()
        made = self._made_outcome()
        faults.extend(faults_of_conditions(plan, coded, self.columns_known))
        outcome = self._outcome()
        if faults or outcome is None:
            raise InputFault(tuple(dict.fromkeys(faults)))
        columns = {name: column.column for name, column in coded.items()}
        left_out = dict(reasons_told(plan.outcome, columns)) if made is not None else {}
        if plan.records.grouped_by is not None:
            left_out["group-not-recorded"] = {"label": columns[plan.records.grouped_by].label}
        findings = self._findings(used, counts, made or ())
        read = self.source.rows if counts is None else int(counts.values.to_numpy() @ self._weights(counts))
        return Settled(blocks, columns, read, findings, derived, outcome, left_out)

    @property
    def names(self) -> list[str]:
        """All columns of the file, by the plan's names."""
        return [*self.outline.frame.columns, *self.outline.refused]

    @property
    def columns_known(self) -> dict[str, Column]:
        """All columns, of those without a use no more than their names."""
        others = {str(name): Column(str(name), "identifier", str(name)) for name in self.outline.frame.columns}
        return others | {name: column.column for name, column in self.coded.items()}

    def where(self, name: str) -> str:
        """The place of a column in messages."""
        return in_column(self.source.name, file_name(name, self.plan))

    def rows_of(self, name: str) -> Rows:
        """The rows behind the values of a column in small."""
        return self.in_small[name].rows

    def raw(self, name: str) -> RawValues:
        """A column as `code_column` wants it."""
        section, small = section_of(name, self.plan), self.in_small[name]
        own = section.not_recorded if section is not None else None
        return RawValues(
            name,
            small.raw.values,
            small.raw.type,
            self.source.name,
            small.rows,
            self.plan.records.not_recorded if own is None else own,
            file_name(name, self.plan),
            small.different,
        )

    def _column(self, name: str, used: set[str]) -> CodedColumn:
        section, small = section_of(name, self.plan), self.in_small[name]
        if small.incomplete or small.identity is not None:
            kind = kind_by_plan(section) or "identifier"
            return CodedColumn(NOTHING, described(name, kind, section), None, _said(name, kind, small))
        coded = code_column(self.raw(name), section, use_of(name, used, self.plan))
        if coded.column.kind == "date" and name in self._dates and not coded.faults:
            try:
                orders = orders_of_dates(coded.values, where=self.where(name), rows=small.rows)
            except InputFault:  # told by what is made of the dates
                return coded
            return replace(coded, day_first=orders)
        return coded

    @property
    def _dates(self) -> set[str]:
        between = {source for section in self.plan.derived.values() for source in section.years_between or ()}
        return between | set(self.plan.outcome.dates)

    def _counts(self) -> CodedColumn | None:
        name = self.plan.records.count
        if name is None or name not in self.coded or self.coded[name].faults:
            return None
        where = in_column(self.source.name, name)
        found = faults_of_counts(self.coded[name], where=where, rows=self.rows_of(name))
        self.faults.extend(found)
        return None if found else self.coded[name]

    def _weights(self, counts: CodedColumn) -> np.ndarray:
        weights = self.rows_of(counts.column.name).weights
        return np.ones(len(counts.values)) if weights is None else weights

    def _codes(self) -> dict[str, ColumnCode]:
        """How the columns that are not at fault are coded, identifiers and dates only where the plan asks for them."""
        ranges, in_use = plausible_ranges(self.plan), columns_in_use(self.plan, self.coded)
        in_use.update(name for name in (self.plan.records.grouped_by,) if name is not None)
        return {
            name: ColumnCode(
                column.column,
                file_name(name, self.plan),
                self.raw(name).keys,
                as_texts=self.source.keeps_as_texts(file_name(name, self.plan)),
                days_only=self.in_small[name].days_only,
                plausible=ranges.get(name) if column.column.kind == "number" else None,
                everyone=self._everyone(name, column),
                day_first=column.day_first,
            )
            for name, column in self.coded.items()
            if not column.faults and (name in in_use or column.column.kind not in ("identifier", "date"))
        }

    def _everyone(self, name: str, column: CodedColumn) -> tuple[str, ...] | None:
        """The texts of all groups. Raises: InputFault where they do not fit into memory."""
        if name != self.plan.records.grouped_by or not isinstance(column.values.dtype, pd.CategoricalDtype):
            return None
        texts = tuple(column.values.cat.categories)
        if BYTES_OF_A_GROUP * len(texts) > self.memory:
            raise InputFault(fault("needs-memory", "the plan, [records] grouped_by"))
        return texts if column.column.kind in ("identifier", "date") else None

    def _derived(self) -> tuple[DerivedColumn, ...]:
        if not self.plan.derived:
            return ()
        self.faults.extend(faults_of_derived_names(self.plan, self.names))
        made = DerivingInSmall(
            self.plan,
            dict(self.coded),
            self.where,
            RowsInOrder(self.source.first_row),
            np.empty(0),
            together=self.together,
            rows_of=self.rows_of,
        ).all_columns()
        made.join(self.coded, self.faults, rows=0)
        return made.made

    def _label_outcome(self) -> None:
        asked, label = self.plan.outcome.column, self.plan.outcome.label
        if asked is not None and asked in self.coded and label is not None:
            self.coded[asked] = replace(self.coded[asked], column=replace(self.coded[asked].column, label=label))

    def _made_outcome(self) -> tuple[Finding, ...] | None:
        """What is to be said of an outcome that the plan makes; None where it makes none, or cannot."""
        plan, outcome = self.plan, self.plan.outcome
        if not outcome_can_be_made(plan, self.coded):
            return None
        try:
            refuse_taken_name(outcome, {*self.outline.frame.columns, *self.coded})
            if outcome.event_when is None:
                follow_up_of(self._dates_in_small(), outcome)
            else:
                vet_condition(outcome.event_when, self.columns_known, WHERE)
            found = faults_of_one_value(self.together.events, self.together.event_free)
            if found:
                raise InputFault(found)
        except InputFault as refused:
            self.faults.extend(refused.faults)
            return None
        self.coded[outcome.column_name] = CodedColumn(NOTHING, column_of_outcome(outcome))
        return told_of_late_events(self.together.late, outcome)

    def _dates_in_small(self) -> Table:
        columns = {name: self.coded[name].column for name in self.plan.outcome.dates}
        texts = {name: self.coded[name].values for name in columns}
        return _DatesInSmall(
            pd.DataFrame(), columns, {}, None, self.where, RowsInOrder(), texts=texts, small=self.in_small
        )

    def _outcome(self) -> CodedOutcome | None:
        """The two values of the outcome, with no rows; None where it is at fault."""
        outcome, name, nobody = self.plan.outcome, self.plan.outcome.column_name, np.empty(0, dtype=np.bool_)
        if outcome.column is None:
            return CodedOutcome(nobody, nobody, "yes", "no", name)
        if name not in self.coded or self.coded[name].faults:
            return None
        if name in self.together.met:
            values = self.coded[name].values
            texts = list(values.cat.categories) if isinstance(values.dtype, pd.CategoricalDtype) else []
            coded, records = self.together.met[name].in_small(texts)
        else:
            coded, records = self.coded[name], np.asarray(self.rows_of(name).weights, dtype=np.float64)
        frame = pd.DataFrame({name: coded.values})
        small = Records(
            frame, {name: coded.column}, len(frame), self.source.name, "", counts=pd.Series(records, dtype=np.float64)
        )
        try:
            return replace(code_outcome(small, outcome), event=nobody, recorded=nobody)
        except InputFault as found:
            self.faults.extend(found.faults)
            return None

    def _findings(
        self, used: set[str], counts: CodedColumn | None, of_outcome: tuple[Finding, ...]
    ) -> tuple[Finding, ...]:
        plan, ranges = self.plan, plausible_ranges(self.plan)
        found = [*self.outline.findings, *(said for name in self.coded for said in self._said_of(name))]
        found += [
            implausible_finding(name, self.together.implausible[name][1], ranges[name])
            for name in self.coded
            if self.together.implausible.get(name, (0, 0))[0]
        ]
        found += [*references_taken(plan, self.coded, used), *of_outcome]
        if plan.records.grouped_by is not None:
            found = [one for one in found if not is_of_persons(one, plan.records.grouped_by)]
        if counts is not None:
            zeros = int(self._weights(counts)[counts.values.to_numpy(dtype=np.float64) == 0].sum())
            found += [finding("note", "rows-of-no-record", zeros=zeros)] if zeros else []
        return tuple(found)

    def _said_of(self, name: str) -> tuple[Finding, ...]:
        """The findings of a column, its emptiness by all rows where only the ends of its numbers are known."""
        said = self.coded[name].findings
        if name not in self.in_small or self.in_small[name].different is None or name not in self.together.recorded:
            return said
        return tuple(one for one in said if one.code != "column-empty")


@dataclass(frozen=True, slots=True)
class _DatesInSmall(Table):
    """Columns of dates in small, each with rows of its own. texts: as they are coded."""

    texts: Mapping[str, pd.Series] = field(default_factory=dict)
    small: Mapping[str, Miniature] = field(default_factory=dict)

    def days(self, name: str) -> Days:
        return parse_dates(self.texts[name], where=self.where(name), rows=self.rows_of(name))

    def rows_of(self, name: str) -> Rows:
        return self.small[name].rows


def _said(name: str, kind: str, small: Miniature) -> tuple[Finding, ...]:
    """What is to be said of an identifier whose values are not kept."""
    if kind == "date":
        return ()
    if small.identity is None:
        return (finding("caution", "identifier-not-checked", column=name),)
    records, different = small.identity
    if records == 0:
        return (finding("caution", "column-empty", column=name),)
    return repeats_found(name, records, different)


def outline_of(source: Source) -> RawTable:
    """The columns of a source without rows. Notes on what is repaired in them follow when they are surveyed."""
    plain = [name for name in source.names if name not in source.refused]
    frame = pd.DataFrame({name: pd.Series(dtype=np.float64) for name in plain})
    return RawTable(frame, {}, source.name, "", source.findings, source.refused, source.first_row)


def with_repairs(outline: RawTable, source: Source, surveyed: Mapping[str, Miniature]) -> RawTable:
    """The outline with the notes on its surveyed columns (by the file's names), before those on its names."""
    raw = {name: surveyed[name].raw for name in source.names if name in surveyed}
    told = told_of_columns(raw, source.refused)
    renaming = outline.findings[len(source.findings) :]
    return replace(outline, findings=(*source.findings, *told, *renaming))
