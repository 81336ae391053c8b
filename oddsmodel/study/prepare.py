"""Everything about the models of a plan that comes before fitting: formulas, who is analysed, designs."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.encoder import Design, build_design, design_of
from oddsmodel.design.formula import VettedFormula, vet_formula
from oddsmodel.design.training import FrameTraining, Training
from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.model.rows import Levels
from oddsmodel.passes import Passes
from oddsmodel.plan.faults import fault, shown_key
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ModelSection, StudyPlan
from oddsmodel.records.accounting import account
from oddsmodel.records.outcome import CodedOutcome
from oddsmodel.records.types import Column, Records
from oddsmodel.records.usable import unusable_in_formula
from oddsmodel.results.study import Flow
from oddsmodel.study.based_on import WrittenOut, write_out
from oddsmodel.study.deviations import with_deviations
from oddsmodel.study.priors import faults_of_prior, faults_of_prior_in_design
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class HeldRecords:
    """included (n,): which of the records read are analysed. frame, event, counts: those that are."""

    included: NDArray[np.bool_]
    frame: pd.DataFrame
    event: NDArray[np.bool_]
    counts: Array | None

    def some(self, rows: NDArray[np.bool_]) -> HeldRecords:
        """Those of the analysed records for which `rows` is true."""
        included = self.included.copy()
        included[self.included] = rows
        counts = None if self.counts is None else self.counts[rows]
        return HeldRecords(included, self.frame[rows].reset_index(drop=True), self.event[rows], counts)


@dataclass(frozen=True)
class Prepared:
    """One model, ready to be fitted. design is None where no record is left or only one outcome is.

    section: with everything that it takes from the model it builds upon; differs: what sets it apart, in words.
    flow: who was counted. held: the analysed records, where they are in memory; else people: a pass over them, with the
    levels of their columns. added: whether it is the program's and not the plan's. shared: whether its records are
    those complete for all models that share theirs. needed: the columns that must be recorded. columns: what is known
    of the records' columns, with the main model's standard deviations.
    """

    section: ModelSection
    id: str
    formula: VettedFormula
    exposures: tuple[str, ...]
    adjustment: tuple[str, ...]
    flow: Flow
    design: Design | None
    shared: bool
    columns: Mapping[str, Column]
    differs: str = ""
    needed: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()
    held: HeldRecords | None = None
    people: Passes | None = None
    levels: Levels = field(default_factory=dict)
    added: bool = False

    @property
    def in_memory(self) -> HeldRecords:
        """The analysed records, for what needs all of them at once."""
        if self.held is None:
            raise TypeError("these records are not in memory")
        return self.held


@dataclass(frozen=True)
class Vetted:
    """A model whose formula was read."""

    section: ModelSection
    differs: str
    formula: VettedFormula


def prepare(plan: StudyPlan, records: Records, outcome: CodedOutcome) -> tuple[Prepared, ...]:
    """All models of the plan, or InputFault with the faults of all of them together."""
    vetted = vet_models(plan, records.columns)
    counts = None if records.counts is None else np.asarray(records.counts, dtype=np.float64)
    prepared: list[Prepared] = []
    faults: list[Fault] = []
    for number in range(len(vetted.models)):
        try:
            columns = prepared[0].columns if prepared else None
            prepared.append(_prepare(plan, records, outcome, counts, vetted, number, columns))
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)
    return tuple(prepared)


@dataclass(frozen=True)
class VettedModels:
    """The models of a plan in order. used: the record columns of any of them."""

    models: tuple[Vetted, ...]

    @property
    def used(self) -> tuple[str, ...]:
        return tuple(dict.fromkeys(column for one in self.models for column in one.formula.columns))

    def needed(self, number: int) -> tuple[str, ...]:
        """The columns that must be recorded for a model."""
        if not self.models[number].section.same_records:
            return self.models[number].formula.columns
        sharing = [one for one in self.models if one.section.same_records]
        return tuple(dict.fromkeys(column for one in sharing for column in one.formula.columns))

    def shared(self, number: int) -> bool:
        """Whether a model's records are those complete for all models that share theirs, and there are several."""
        sharing = sum(one.section.same_records for one in self.models)
        return sharing > 1 and self.models[number].section.same_records


def vet_models(plan: StudyPlan, columns: Mapping[str, Column]) -> VettedModels:
    """The models with their formulas read against the columns; InputFault with the faults of all together."""
    written, faults = write_out(plan.models, columns, plan.outcome.column_name)
    faults.extend(_faults_of_averages(plan, columns))
    vetted: list[Vetted] = []
    for model in written:
        try:
            vetted.append(_vet(model, plan, columns))
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)
    return VettedModels(tuple(vetted))


def conditions(plan: StudyPlan, section: ModelSection) -> list[str]:
    """Who belongs: the plan's condition and the model's own."""
    return [condition for condition in (plan.records.keep, section.keep) if condition is not None]


def on_records_of(prepared: Prepared, other: Prepared) -> Prepared | None:
    """The model on the records it shares with another one; None where it cannot be built there."""
    own = prepared.in_memory
    rows = other.in_memory.included[own.included]
    if not rows.any() or prepared.design is None:
        return None
    held = own.some(rows)
    try:
        design = build_design(prepared.formula, held.frame, prepared.columns, prepared.exposures, held.counts)
    except InputFault:
        return None
    weight = np.ones(len(held.event)) if held.counts is None else held.counts
    flow = replace(prepared.flow, analysed=round(weight.sum()), events=round(weight[held.event].sum()))
    return replace(prepared, design=design, flow=flow, held=held, shared=False, findings=())


def _faults_of_averages(plan: StudyPlan, columns: Mapping[str, Column]) -> Iterator[Fault]:
    """Columns whose levels are to be compared with their average, though they are no categories."""
    for name, section in plan.columns.items():
        column = columns.get(name)
        if section.compare_with == "network average" and column is not None and column.kind != "category":
            yield fault("average-kind", f"the plan, [columns.{shown_key(name)}] compare_with", kind=column.kind)


def _vet(written: WrittenOut, plan: StudyPlan, columns: Mapping[str, Column]) -> Vetted:
    section, outcome = written.section, plan.outcome.column_name
    model = f"the plan, [[models]] {quoted(section.name)}"
    formula = vet_formula(section.formula, columns=columns, outcome=outcome, where=f"{model} formula")
    faults = unusable_in_formula(columns, formula.columns, f"{model} formula")
    for exposure in section.exposures:
        if exposure not in formula.columns:
            near = nearest(exposure, formula.columns)
            facts = {"exposure": quoted(exposure), "nearest": "" if near is None else quoted(near)}
            faults.append(fault("exposure-not-in-formula", f"{model} exposures", **facts))
    faults.extend(_faults_of_trends(section, formula, plan, columns, model))
    faults.extend(faults_of_prior(section, formula.columns))
    if plan.records.grouped_by in formula.columns:
        faults.append(fault("grouped-by-in-formula", f"{model} formula", column=quoted(str(plan.records.grouped_by))))
    if faults:
        raise InputFault(faults)
    return Vetted(section, written.differs, formula)


def _faults_of_trends(
    section: ModelSection, formula: VettedFormula, plan: StudyPlan, columns: Mapping[str, Column], model: str
) -> Iterator[Fault]:
    for number, name in enumerate(section.trend):
        where = f"{model} trend, item {number + 1}"
        if name not in formula.columns:
            near = nearest(name, formula.columns)
            yield fault(
                "trend-not-in-formula",
                where,
                column=quoted(name),
                nearest=None if near is None else quoted(near),
                valid=[quoted(column) for column in formula.columns],
                otherwise="It holds no column.",
            )
            continue
        column, stated = columns[name], plan.columns.get(name)
        if column.kind != "ordered":
            yield fault("trend-not-ordered", where, column=quoted(name), kind=column.kind)
        elif stated is not None and stated.scores is not None and len(stated.scores) != len(column.levels):
            at = f"the plan, [columns.{shown_key(name)}] scores"
            yield fault("scores-number", at, scores=len(stated.scores), levels=len(column.levels))


def _prepare(
    plan: StudyPlan,
    records: Records,
    outcome: CodedOutcome,
    counts: Array | None,
    vetted: VettedModels,
    number: int,
    columns: Mapping[str, Column] | None,
) -> Prepared:
    """columns: as the main model left them, with its standard deviations; None where this is the main model."""
    model, needed = vetted.models[number], vetted.needed(number)
    exposures = tuple(model.section.exposures)
    accounting = account(
        records,
        outcome,
        keep=conditions(plan, model.section),
        exposures=exposures,
        adjustment=tuple(column for column in needed if column not in exposures),
    )
    rows = accounting.included
    frame = records.frame.loc[rows].reset_index(drop=True)
    held = HeldRecords(rows, frame, outcome.event[rows], None if counts is None else counts[rows])
    if columns is None:
        columns = with_deviations(records.columns, vetted.used, frame, held.counts)
    training = FrameTraining(frame, model.formula.where, held.counts)
    return prepared_model(model, number, vetted, accounting.flow, columns, training, held=held)


def prepared_model(
    model: Vetted,
    number: int,
    vetted: VettedModels,
    flow: Flow,
    columns: Mapping[str, Column],
    training: Training,
    *,
    held: HeldRecords | None = None,
    people: Passes | None = None,
    levels: Levels | None = None,
) -> Prepared:
    """One model with its design; the design is None where no record is left or only one outcome is."""
    exposures = tuple(model.section.exposures)
    findings: tuple[Finding, ...] = ()
    design = None
    if not flow.analysed:
        findings = (finding("stop", "no-records-left"),)
    elif flow.events in (0, flow.analysed):
        which = "always happened" if flow.events else "never happened"
        findings = (finding("stop", "one-outcome-only", which=which),)
    else:
        design = design_of(model.formula, training, columns, exposures)
        findings = tuple(design.findings)
        faults = list(faults_of_prior_in_design(model.section, design))
        if faults:
            raise InputFault(faults)
    return Prepared(
        section=model.section,
        id=f"model-{number + 1}",
        formula=model.formula,
        exposures=exposures,
        adjustment=tuple(column for column in model.formula.columns if column not in exposures),
        flow=flow,
        design=design,
        shared=vetted.shared(number),
        columns=columns,
        differs=model.differs,
        needed=vetted.needed(number),
        findings=findings,
        held=held,
        people=people,
        levels=levels or {},
    )
