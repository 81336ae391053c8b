"""Makes the derived columns of a plan, each after those that it is made from."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np
import pandas as pd

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.condition import vet_condition
from oddsmodel.records.derived.bands import bands
from oddsmodel.records.derived.groups import groups
from oddsmodel.records.derived.making import Array, Made, Making, Mask, Source, place
from oddsmodel.records.derived.points import points
from oddsmodel.records.derived.quantile_groups import quantile_groups
from oddsmodel.records.derived.years import years
from oddsmodel.records.faults import fault
from oddsmodel.records.mentions import mentioned
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


def derive(
    plan: StudyPlan, coded: Mapping[str, CodedColumn], weights: Array, where: Callable[[str], str], first_row: int
) -> Derived:
    """The derived columns of a plan.

    coded: the columns of the file. weights (n,): records that each row stands for. where: the place of a column of the
    file in messages; first_row: what the first row is called.
    """
    work = _Work(plan, dict(coded), weights, where, first_row)
    for name in plan.derived:
        work.make(name)
    made = tuple(work.made[name] for name in plan.derived if name in work.made)
    columns = {one.name: work.columns[one.name] for one in made}
    return Derived(columns, made, tuple(name for name in plan.derived if name not in work.made), tuple(work.faults))


@dataclass
class _Work:
    plan: StudyPlan
    columns: dict[str, CodedColumn]
    weights: Array
    where: Callable[[str], str]
    first_row: int
    made: dict[str, DerivedColumn] = field(default_factory=dict)
    begun: set[str] = field(default_factory=set)
    faults: list[Fault] = field(default_factory=list)

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
        sources = tuple(Source(self.columns[one], self.where(one), self.first_row) for one in section.sources)
        rule = next(rule for rule in RULES if rule in section.model_fields_set)
        try:
            kept = self._kept() if by_quantiles else np.ones(len(self.weights), dtype=np.bool_)
            if kept is None:
                return
            found = RULES[rule](Making(name, section, sources, kept, self.weights))
        except InputFault as fault_found:
            self.faults.extend(fault_found.faults)
            return
        self.columns[name] = found.coded
        labels = [source.column.label for source in sources]
        told = say(f"derived-rule-{rule}", sources=labels, zero=section.if_part_missing == "zero")
        column = found.coded.column
        self.made[name] = DerivedColumn(name, column.label, column.kind, rule, told, section.sources, found.cut_points)

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
        text = self.plan.records.keep
        if text is None:
            return np.ones(len(self.weights), dtype=np.bool_)
        columns = {name: one.column for name, one in self.columns.items()}
        condition = vet_condition(text, columns, "the plan, [records] keep")
        if any(self.columns[name].faults for name in condition.columns):
            return None
        frame = pd.DataFrame({name: self.columns[name].values for name in condition.columns})
        masks = {name: self.columns[name].outside for name in condition.columns}
        outside = {name: pd.Series(mask) for name, mask in masks.items() if mask is not None}
        holds, _ = condition.evaluate(frame, outside)
        return holds
