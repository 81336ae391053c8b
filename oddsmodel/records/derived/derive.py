"""Makes the derived columns of a plan, each after those that it is made from."""

from __future__ import annotations

from collections.abc import Callable, Container, Mapping
from dataclasses import dataclass, field

import numpy as np
import pandas as pd

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.schema import DerivedSection, StudyPlan
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.condition import Condition, vet_condition
from oddsmodel.records.derived.bands import bands
from oddsmodel.records.derived.groups import groups
from oddsmodel.records.derived.making import Array, Made, Making, Mask, Source, place
from oddsmodel.records.derived.points import points
from oddsmodel.records.derived.quantile_groups import quantile_groups
from oddsmodel.records.derived.years import years
from oddsmodel.records.faults import fault
from oddsmodel.records.mentions import mentioned
from oddsmodel.records.rows import Rows
from oddsmodel.records.types import Column
from oddsmodel.results.derived import DerivedColumn, Rule
from oddsmodel.wording import say
from oddsmodel.wording.plain import quoted

RULES: dict[Rule, Callable[[Making], Made]] = {
    "bands_of": bands,
    "years_between": years,
    "points": points,
    "groups_of": groups,
    "quantile_groups_of": quantile_groups,
}


@dataclass(frozen=True, slots=True)
class Derived:
    """columns: the derived columns that could be made. made: how. unmade: names of the others.

    faults: why not, where it is not that a source is itself at fault.
    """

    columns: Mapping[str, CodedColumn]
    made: tuple[DerivedColumn, ...]
    unmade: tuple[str, ...]
    faults: tuple[Fault, ...]

    def join(self, coded: dict[str, CodedColumn], faults: list[Fault], *, rows: int) -> None:
        """Add the columns to the coded ones, and the faults to the others.

        A column that could not be made joins with all faults so far, so that what asks for it is not asked about.
        """
        faults.extend(self.faults)
        coded.update(self.columns)
        for name in self.unmade:
            nothing = pd.Series(np.full(rows, np.nan))
            coded[name] = CodedColumn(nothing, Column(name, "number", name), faults=tuple(faults))


def faults_of_derived_names(plan: StudyPlan, names: Container[str]) -> list[Fault]:
    """The faults of derived columns that are called as columns of the file."""
    taken = [name for name in plan.derived if name in names]
    return [fault("derived-name-taken", place(name), column=quoted(name)) for name in taken]


def derive(
    plan: StudyPlan, coded: Mapping[str, CodedColumn], weights: Array, where: Callable[[str], str], rows: Rows
) -> Derived:
    """The derived columns of a plan.

    coded: the columns of the file. weights (n,): records that each row stands for. where: the place of a column of the
    file in messages; rows: what the rows are called.
    """
    return Deriving(plan, dict(coded), where, rows, weights).all_columns()


@dataclass
class Deriving:
    """The work of deriving: columns so far, what is made of them, and why something cannot be made."""

    plan: StudyPlan
    columns: dict[str, CodedColumn]
    where: Callable[[str], str]
    rows: Rows
    weights: Array
    made: dict[str, DerivedColumn] = field(default_factory=dict)
    begun: set[str] = field(default_factory=set)
    faults: list[Fault] = field(default_factory=list)

    def all_columns(self) -> Derived:
        """Everything that can be made."""
        for name in self.plan.derived:
            self.make(name)
        made = tuple(self.made[name] for name in self.plan.derived if name in self.made)
        columns = {one.name: self.columns[one.name] for one in made}
        unmade = tuple(name for name in self.plan.derived if name not in self.made)
        return Derived(columns, made, unmade, tuple(self.faults))

    def make(self, name: str) -> None:
        """Make a column, those that it needs first; nothing is made where one of these could not be."""
        if name in self.begun:
            return
        self.begun.add(name)
        section = self.plan.derived[name]
        by_quantiles = section.quantile_groups_of is not None
        in_keep = mentioned(self.plan.derived, self.plan.records.keep) if by_quantiles else []
        if name in in_keep or any(self._waits_for(other, name) for other in in_keep):
            self.faults.append(fault("derived-circle", place(name), column=quoted(name)))
            return
        for source in (*section.sources, *in_keep):
            if source in self.plan.derived:
                self.make(source)
        if any(source not in self.columns or self.columns[source].faults for source in (*section.sources, *in_keep)):
            return
        rule = next(rule for rule in RULES if rule in section.model_fields_set)
        try:
            found = self.by_rule(rule, name, section)
            if found is None:
                return
        except InputFault as fault_found:
            self.faults.extend(fault_found.faults)
            return
        self.columns[name] = found.coded
        labels = [self.columns[source].column.label for source in section.sources]
        told = say(f"derived-rule-{rule}", sources=labels, zero=section.if_part_missing == "zero")
        column = found.coded.column
        self.made[name] = DerivedColumn(name, column.label, column.kind, rule, told, section.sources, found.cut_points)

    def by_rule(self, rule: Rule, name: str, section: DerivedSection) -> Made | None:
        """The column by its rule; None where a column that it needs is at fault. Raises: InputFault as the rules do."""
        sources = tuple(Source(self.columns[one], self.where(one), self.rows) for one in section.sources)
        kept = self._kept() if rule == "quantile_groups_of" else np.ones(len(self.weights), dtype=np.bool_)
        return None if kept is None else RULES[rule](Making(name, section, sources, kept, self.weights))

    def _waits_for(self, name: str, other: str) -> bool:
        """Whether a derived column is made from another, directly or not."""
        waiting, seen = [name], set()
        while waiting:
            one = waiting.pop()
            if one == other:
                return True
            if one in self.plan.derived and one not in seen:
                seen.add(one)
                waiting += self.plan.derived[one].sources
        return False

    def _kept(self) -> Mask | None:
        """Rows (n,) that the plan's condition is known to hold for; None where a column in it is at fault.

        Raises: InputFault as `vet_condition` does.
        """
        condition = self.condition_of_keep()
        if condition is None:
            return np.ones(len(self.weights), dtype=np.bool_)
        if any(self.columns[name].faults for name in condition.columns):
            return None
        frame = pd.DataFrame({name: self.columns[name].values for name in condition.columns})
        masks = {name: self.columns[name].outside for name in condition.columns}
        outside = {name: pd.Series(mask) for name, mask in masks.items() if mask is not None}
        holds, _ = condition.evaluate(frame, outside)
        return holds

    def condition_of_keep(self) -> Condition | None:
        """The plan's condition, if it has one. Raises: InputFault as `vet_condition` does."""
        columns = {name: one.column for name, one in self.columns.items()}
        keep = self.plan.records.keep
        return None if keep is None else vet_condition(keep, columns, "the plan, [records] keep")
