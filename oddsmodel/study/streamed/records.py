"""The records of a study on disk or on workers, as its results need them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.encoder import design_of
from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.measures.characteristics import Described, characteristics_of
from oddsmodel.measures.derived_counts import derived_counts
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.measures.groups import groups_of_study
from oddsmodel.measures.lost import Followed
from oddsmodel.model.counted import CountedPeople, PassesTraining, recorded_values
from oddsmodel.model.rows import COLUMN, Levels
from oddsmodel.passes import Leaf, Passes
from oddsmodel.records.accounting import Tally, flow_of
from oddsmodel.records.types import Column
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.results.tables import Table
from oddsmodel.study.deviations import with_deviations_of
from oddsmodel.study.prepare import Prepared, conditions, prepared_model
from oddsmodel.study.streamed.gather import Gather

GROUP, ANALYSED = "group of the table", "whether analysed"
LOST, COMPLETE = "whether lost", "whether complete"
YES_NO = ("no", "yes")


@dataclass(frozen=True)
class StreamedRecords:
    """See `StudyRecords`. rows: a pass over everything gathered."""

    gather: Gather
    rows: Passes
    levels: Levels
    has_counts: bool

    @property
    def columns(self) -> Mapping[str, Column]:
        return self.gather.stream.columns

    @property
    def source(self) -> str:
        return self.gather.stream.source

    @property
    def sha256(self) -> str:
        return self.gather.stream.sha256

    @property
    def read(self) -> int:
        return self.gather.stream.read

    @property
    def findings(self) -> tuple[Finding, ...]:
        return self.gather.stream.findings

    @property
    def event_label(self) -> str:
        return self.gather.stream.event_label

    @property
    def other_label(self) -> str:
        return self.gather.stream.other_label

    def people(self, mask: str, names: Sequence[str], *more: str) -> Passes:
        """The rows of a mask with some record columns; more: other arrays."""
        counts = ("count",) if self.has_counts else ()
        arrays = ("event", *counts, *more, *(COLUMN + name for name in names), mask)
        return self.rows.only(arrays).selected(mask)

    def kept(self, prepared: Prepared) -> CountedPeople:
        """See `StudyRecords`."""
        mask = f"kept:{self.gather.population_of(_number(prepared))}"
        return CountedPeople(self.people(mask, self.gather.columns), self.levels)

    def characteristics(self, main: Prepared) -> Table:
        """See `StudyRecords`."""
        plan, columns = self.gather.plan, self.columns
        exposure = columns[main.exposures[0]]
        kept = self.kept(main).of(*main.exposures)
        known = kept.frame[list(main.exposures)].notna().all(axis=1).to_numpy(dtype=np.bool_)
        some = kept.frame.loc[known].reset_index(drop=True)
        counts = None if kept.counts is None else kept.counts[known]
        groups = groups_of_study(plan.study.design, exposure, some, kept.event[known], counts)
        number = _number(main)
        names = tuple(dict.fromkeys((*main.exposures, *main.adjustment)))
        mask, flag = f"kept:{self.gather.population_of(number)}", f"analysed:{number}"
        marked = self.people(mask, names, flag).mapped(
            _Marked(
                flag,
                main.exposures,
                None if plan.study.design in CASE_CONTROL else exposure.name,
                groups.cuts,
                {name for name in names if columns[name].kind == "number"},
            )
        )
        marks = {GROUP: groups.labels, ANALYSED: YES_NO}
        people = CountedPeople(marked, {**self.levels, **marks})

        def described(*name: str) -> Described:
            found = people.of(*name, GROUP, ANALYSED)
            group = np.asarray(found.frame[GROUP].cat.codes, dtype=np.int64)
            analysed = found.frame[ANALYSED].cat.codes.to_numpy(dtype=np.int64) == 1
            weight = np.ones(group.size) if found.counts is None else found.counts
            values = found.frame[name[0]] if name else pd.Series(analysed)
            return Described(values, group, analysed, weight)

        return characteristics_of(described(), described, columns, names, groups)

    def followed(self, prepared: Prepared, exposure: str) -> Followed:
        """See `StudyRecords`."""
        number = _number(prepared)
        mask = f"followed:{self.gather.population_of(number)}"
        passes = self.people(mask, (exposure,), "recorded", f"complete:{number}")
        people = CountedPeople(
            passes.mapped(_Lost(f"complete:{number}")), {**self.levels, LOST: YES_NO, COMPLETE: YES_NO}
        )
        found = people.of(exposure, LOST, COMPLETE)
        lost, complete = (found.frame[name].cat.codes.to_numpy() == 1 for name in (LOST, COMPLETE))
        return Followed(found.frame, lost, complete, found.counts)

    def derived(self, main: Prepared) -> tuple[DerivedColumn, ...]:
        """See `StudyRecords`. A column made from dates is told without its counts."""
        told = []
        for one in self.gather.stream.derived:
            names = (one.name, *one.sources)
            if set(names) <= set(self.gather.columns):
                people = CountedPeople(self.people(f"analysed:{_number(main)}", names), self.levels)
                found = people.of(*names)
                one = replace(one, tables=derived_counts(one, found.frame, main.columns, found.counts))
            told.append(one)
        return tuple(told)

    def on_records_of(self, prepared: Prepared, other: Prepared) -> Prepared | None:
        """See `StudyRecords`."""
        number = _number(prepared)
        people = self.people(f"both:{number}", prepared.formula.columns)
        if not people.rows or prepared.design is None:
            return None
        training = PassesTraining(people, self.levels, prepared.formula.where)
        try:
            design = design_of(prepared.formula, training, prepared.columns, prepared.exposures)
        except InputFault:
            return None
        counted = CountedPeople(people, self.levels).of()
        weight = np.ones(len(counted.event)) if counted.counts is None else counted.counts
        flow = replace(prepared.flow, analysed=round(weight.sum()), events=round(weight[counted.event].sum()))
        return replace(prepared, design=design, flow=flow, people=people, shared=False, findings=())


def prepare_streamed(data: StreamedRecords, tallies: Sequence[Sequence[Tally]]) -> tuple[Prepared, ...]:
    """All models of the plan; tallies: of every model, over all blocks. InputFault with the faults of all of them."""
    gather, plan = data.gather, data.gather.plan
    facts = gather.stream.left_out_facts
    faults: list[Fault] = []
    prepared: list[Prepared] = []
    for number, model in enumerate(gather.vetted.models):
        keep = conditions(plan, model.section)
        flow = flow_of(tallies[number], data.read, data.columns, keep, facts)
        people = data.people(f"analysed:{number}", model.formula.columns)
        training = PassesTraining(people, data.levels, model.formula.where)
        if prepared:
            columns = prepared[0].columns
        else:
            everything = data.people(f"analysed:{number}", gather.vetted.used)
            columns = with_deviations_of(data.columns, gather.vetted.used, partial(recorded_values, everything))
        try:
            prepared.append(
                prepared_model(model, number, gather.vetted, flow, columns, training, people=people, levels=data.levels)
            )
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)
    return tuple(prepared)


def _number(prepared: Prepared) -> int:
    """The place of the plan's model that it is, or stands beside."""
    return int(prepared.id.split("-")[1]) - 1


@dataclass(frozen=True)
class _Marked:
    """Adds each record's group of the table of characteristics, and whether the model uses it.

    exposures: a record without one of them is in no group. by: the column that makes the groups, None for the outcome;
    cuts: of a number.
    """

    flag: str
    exposures: tuple[str, ...]
    by: str | None
    cuts: tuple[float, ...] | None
    numbers: set[str]

    def __call__(self, rows: Leaf) -> Leaf:
        known = np.ones(len(rows["event"]), dtype=np.bool_)
        for name in self.exposures:
            values = rows[COLUMN + name]
            known &= np.isfinite(values) if name in self.numbers else values >= 0
        group: NDArray[np.int64]
        if self.by is None:
            group = np.where(rows["event"], 0, 1)
        elif self.cuts is not None:
            group = np.searchsorted(np.asarray(self.cuts), rows[COLUMN + self.by], side="left")
        else:
            group = rows[COLUMN + self.by].astype(np.int64)
        return {**rows, COLUMN + GROUP: np.where(known, group, -1), COLUMN + ANALYSED: rows[self.flag].astype(np.int8)}


@dataclass(frozen=True)
class _Lost:
    """Adds whether the outcome is not recorded and whether all else is."""

    complete: str

    def __call__(self, rows: Leaf) -> Leaf:
        return {
            **rows,
            COLUMN + LOST: (~rows["recorded"]).astype(np.int8),
            COLUMN + COMPLETE: rows[self.complete].astype(np.int8),
        }
