"""Everything about the models of a plan that comes before fitting: formulas, who is analysed, designs."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.encoder import Design, build_design
from oddsmodel.design.formula import VettedFormula, vet_formula
from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.faults import fault, shown_key
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ModelSection, StudyPlan
from oddsmodel.records.accounting import Accounting, account
from oddsmodel.records.outcome import CodedOutcome
from oddsmodel.records.types import Column, Records
from oddsmodel.records.usable import unusable_in_formula
from oddsmodel.study.based_on import WrittenOut, write_out
from oddsmodel.study.deviations import with_deviations
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Prepared:
    """One model, ready to be fitted. design is None where no record is left or only one outcome is.

    section: with everything that it takes from the model it builds upon; differs: what sets it apart, in words.
    frame, event, counts: the analysed records. shared: whether its records are those complete for all models
    that share theirs. needed: the columns that must be recorded. columns: what is known of the records' columns,
    with the main model's standard deviations.
    """

    section: ModelSection
    id: str
    formula: VettedFormula
    exposures: tuple[str, ...]
    adjustment: tuple[str, ...]
    accounting: Accounting
    frame: pd.DataFrame
    event: NDArray[np.bool_]
    counts: Array | None
    design: Design | None
    shared: bool
    columns: Mapping[str, Column]
    differs: str = ""
    needed: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = ()


@dataclass(frozen=True)
class _Vetted:
    section: ModelSection
    differs: str
    formula: VettedFormula


def prepare(plan: StudyPlan, records: Records, outcome: CodedOutcome) -> tuple[Prepared, ...]:
    """All models of the plan, or InputFault with the faults of all of them together."""
    written, faults = write_out(plan.models, records.columns, plan.outcome.column_name)
    faults.extend(_faults_of_averages(plan, records))
    vetted: list[_Vetted] = []
    for model in written:
        try:
            vetted.append(_vet(model, plan, records))
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)

    sharing = [one for one in vetted if one.section.same_records]
    common = tuple(dict.fromkeys(column for one in sharing for column in one.formula.columns))
    used = tuple(dict.fromkeys(column for one in vetted for column in one.formula.columns))
    prepared: list[Prepared] = []
    for number, one in enumerate(vetted):
        try:
            needed = common if one.section.same_records else one.formula.columns
            columns = prepared[0].columns if prepared else None
            prepared.append(
                _prepare(plan, records, outcome, one, needed, f"model-{number + 1}", len(sharing) > 1, used, columns)
            )
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)
    return tuple(prepared)


def conditions(plan: StudyPlan, section: ModelSection) -> list[str]:
    """Who belongs: the plan's condition and the model's own."""
    return [condition for condition in (plan.records.keep, section.keep) if condition is not None]


def on_records_of(prepared: Prepared, other: Prepared, records: Records) -> Prepared | None:
    """The model on the records it shares with another one; None where it cannot be built there."""
    both = prepared.accounting.included & other.accounting.included
    if not both.any() or prepared.design is None:
        return None
    rows = both[prepared.accounting.included]
    frame, event = prepared.frame[rows].reset_index(drop=True), prepared.event[rows]
    counts = None if prepared.counts is None else prepared.counts[rows]
    try:
        design = build_design(prepared.formula, frame, prepared.columns, prepared.exposures, counts)
    except InputFault:
        return None
    return Prepared(
        prepared.section,
        prepared.id,
        prepared.formula,
        prepared.exposures,
        prepared.adjustment,
        prepared.accounting,
        frame,
        event,
        counts,
        design,
        shared=False,
        columns=prepared.columns,
    )


def _faults_of_averages(plan: StudyPlan, records: Records) -> Iterator[Fault]:
    """Columns whose levels are to be compared with their average, though they are no categories."""
    for name, section in plan.columns.items():
        column = records.columns.get(name)
        if section.compare_with == "network average" and column is not None and column.kind != "category":
            yield fault("average-kind", f"the plan, [columns.{shown_key(name)}] compare_with", kind=column.kind)


def _vet(written: WrittenOut, plan: StudyPlan, records: Records) -> _Vetted:
    section, outcome = written.section, plan.outcome.column_name
    model = f"the plan, [[models]] {quoted(section.name)}"
    formula = vet_formula(section.formula, columns=records.columns, outcome=outcome, where=f"{model} formula")
    faults = unusable_in_formula(records.columns, formula.columns, f"{model} formula")
    for exposure in section.exposures:
        if exposure not in formula.columns:
            near = nearest(exposure, formula.columns)
            facts = {"exposure": quoted(exposure), "nearest": "" if near is None else quoted(near)}
            faults.append(fault("exposure-not-in-formula", f"{model} exposures", **facts))
    faults.extend(_faults_of_trends(section, formula, plan, records, model))
    if plan.records.grouped_by in formula.columns:
        faults.append(fault("grouped-by-in-formula", f"{model} formula", column=quoted(str(plan.records.grouped_by))))
    if faults:
        raise InputFault(faults)
    return _Vetted(section, written.differs, formula)


def _faults_of_trends(
    section: ModelSection, formula: VettedFormula, plan: StudyPlan, records: Records, model: str
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
        column, stated = records.columns[name], plan.columns.get(name)
        if column.kind != "ordered":
            yield fault("trend-not-ordered", where, column=quoted(name), kind=column.kind)
        elif stated is not None and stated.scores is not None and len(stated.scores) != len(column.levels):
            at = f"the plan, [columns.{shown_key(name)}] scores"
            yield fault("scores-number", at, scores=len(stated.scores), levels=len(column.levels))


def _prepare(
    plan: StudyPlan,
    records: Records,
    outcome: CodedOutcome,
    vetted: _Vetted,
    needed: Sequence[str],
    identity: str,
    shared: bool,
    used: Sequence[str],
    columns: Mapping[str, Column] | None,
) -> Prepared:
    """columns: as the main model left them, with its standard deviations; None where this is the main model."""
    section, formula = vetted.section, vetted.formula
    exposures = tuple(section.exposures)
    accounting = account(
        records,
        outcome,
        keep=conditions(plan, section),
        exposures=exposures,
        adjustment=tuple(column for column in needed if column not in exposures),
    )
    rows = accounting.included
    frame = records.frame.loc[rows].reset_index(drop=True)
    event = outcome.event[rows]
    counts = None if records.counts is None else np.asarray(records.counts, dtype=np.float64)[rows]
    if columns is None:
        columns = with_deviations(records.columns, used, frame, counts)
    findings: tuple[Finding, ...] = ()
    design = None
    present = event if counts is None else event[counts > 0]
    if not present.size:
        findings = (finding("stop", "no-records-left"),)
    elif present.all() or not present.any():
        which = "always happened" if present.all() else "never happened"
        findings = (finding("stop", "one-outcome-only", which=which),)
    else:
        design = build_design(formula, frame, columns, exposures, counts)
        findings = tuple(design.findings)
    return Prepared(
        section=section,
        id=identity,
        formula=formula,
        exposures=exposures,
        adjustment=tuple(column for column in formula.columns if column not in exposures),
        accounting=accounting,
        frame=frame,
        event=event,
        counts=counts,
        design=design,
        shared=shared and section.same_records,
        columns=columns,
        differs=vetted.differs,
        needed=tuple(needed),
        findings=findings,
    )
