"""Everything about the models of a plan that comes before fitting: formulas, who is analysed, designs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.encoder import Design, build_design
from oddsmodel.design.formula import VettedFormula, vet_formula
from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ModelSection, StudyPlan
from oddsmodel.records.accounting import Accounting, account
from oddsmodel.records.outcome import CodedOutcome
from oddsmodel.records.types import Records
from oddsmodel.records.usable import unusable_in_formula
from oddsmodel.wording import finding

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Prepared:
    """One model, ready to be fitted. design is None where no record is left or only one outcome is.

    frame, event, counts: the analysed records. shared: whether its records are those complete for all models
    that share theirs.
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
    findings: tuple[Finding, ...] = ()


@dataclass(frozen=True)
class _Vetted:
    section: ModelSection
    formula: VettedFormula

    @property
    def where(self) -> str:
        return f"[[models]] “{self.section.name}”"


def prepare(plan: StudyPlan, records: Records, outcome: CodedOutcome) -> tuple[Prepared, ...]:
    """All models of the plan, or InputFault with the faults of all of them together."""
    faults: list[Fault] = []
    vetted: list[_Vetted] = []
    for section in plan.models:
        try:
            vetted.append(_vet(section, records, plan.outcome.column))
        except InputFault as fault:
            faults.extend(fault.faults)
    if faults:
        raise InputFault(faults)

    sharing = [one for one in vetted if one.section.same_records]
    common = tuple(dict.fromkeys(column for one in sharing for column in one.formula.columns))
    prepared: list[Prepared] = []
    for number, one in enumerate(vetted):
        try:
            needed = common if one.section.same_records else one.formula.columns
            prepared.append(_prepare(plan, records, outcome, one, needed, f"model-{number + 1}", len(sharing) > 1))
        except InputFault as fault:
            faults.extend(fault.faults)
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
        design = build_design(prepared.formula, frame, records.columns, prepared.exposures, counts)
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
    )


def _vet(section: ModelSection, records: Records, outcome: str) -> _Vetted:
    where = f"[[models]] “{section.name}” formula"
    formula = vet_formula(section.formula, columns=records.columns, outcome=outcome, where=where)
    faults = unusable_in_formula(records.columns, formula.columns, where)
    for exposure in section.exposures:
        if exposure not in formula.columns:
            near = nearest(exposure, formula.columns)
            faults.append(
                Fault(
                    what=f"the exposure “{exposure}” is not a column of the formula.",
                    where=f"[[models]] “{section.name}” exposures",
                    remedy=f"Did you mean “{near}”?" if near else "Name columns that the formula holds.",
                )
            )
    if faults:
        raise InputFault(faults)
    return _Vetted(section, formula)


def _prepare(
    plan: StudyPlan,
    records: Records,
    outcome: CodedOutcome,
    vetted: _Vetted,
    needed: Sequence[str],
    identity: str,
    shared: bool,
) -> Prepared:
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
    findings: tuple[Finding, ...] = ()
    design = None
    present = event if counts is None else event[counts > 0]
    if not present.size:
        findings = (finding("stop", "no-records-left"),)
    elif present.all() or not present.any():
        which = "always happened" if present.all() else "never happened"
        findings = (finding("stop", "one-outcome-only", which=which),)
    else:
        design = build_design(formula, frame, records.columns, exposures, counts)
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
        findings=findings,
    )
