"""What derived columns are, told from what was met among all rows instead of from the rows themselves."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd

from oddsmodel.plan.schema import DerivedSection
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.derived.bands import bands
from oddsmodel.records.derived.derive import Deriving
from oddsmodel.records.derived.groups import groups
from oddsmodel.records.derived.making import Array, Made, Making, Source, number_values, of_numbers
from oddsmodel.records.derived.points import parts_of_score
from oddsmodel.records.derived.quantile_groups import quantile_groups
from oddsmodel.records.derived.years import days_of_sources, told_of_years
from oddsmodel.records.rows import Rows
from oddsmodel.records.stream.met import Met
from oddsmodel.records.stream.together import Together
from oddsmodel.results.derived import Rule

NONE: Array = np.empty(0)


@dataclass
class DerivingInSmall(Deriving):
    """As `Deriving`, of columns in small. together: what was met among all rows; rows_of: behind a column's values."""

    together: Together = field(default_factory=Together)
    rows_of: Callable[[str], Rows] | None = None

    def by_rule(self, rule: Rule, name: str, section: DerivedSection) -> Made | None:
        if rule == "quantile_groups_of" and not self._keep_is_sound():
            return None
        if rule == "years_between":
            return self._years(name, section)
        if rule == "points":
            making = self._making(name, section, [self._met(source)[0] for source in section.sources], NONE)
            parts_of_score(making)
            return Made(of_numbers(making, NONE))
        source = section.sources[0]
        if rule == "groups_of":
            coded, records = self._met(source)
            return groups(self._making(name, section, [coded], records))
        numbers, weights = NONE, NONE
        making = self._making(name, section, [self.columns[source]], NONE)
        number_values(making, making.sources[0])
        if rule == "quantile_groups_of":
            numbers, counts = self.together.kept[name].all()
            weights = counts.astype(np.float64)
        edges = (section.edges or ()) if rule == "bands_of" else self.together.cuts.get(name, ())
        of_bands = _one_of_each(self.together.met.get(name), edges)
        values = replace(self.columns[source], values=pd.Series(np.append(numbers, of_bands)))
        weights = np.append(weights, np.zeros(len(of_bands)))
        made = self._making(name, section, [values], weights)
        return bands(made) if rule == "bands_of" else quantile_groups(made)

    def _years(self, name: str, section: DerivedSection) -> Made:
        making = self._making(name, section, [self.columns[source] for source in section.sources], NONE)
        days_of_sources(making)
        told = told_of_years(making, self.together.backwards.get(name, 0))
        return Made(replace(of_numbers(making, NONE), findings=told))

    def _making(self, name: str, section: DerivedSection, sources: list[CodedColumn], weights: Array) -> Making:
        of_file = self.rows_of or (lambda name: self.rows)
        found = tuple(
            Source(coded, self.where(source), of_file(source) if source not in self.plan.derived else self.rows)
            for coded, source in zip(sources, section.sources, strict=True)
        )
        return Making(name, section, found, np.ones(len(weights), dtype=np.bool_), weights)

    def _met(self, source: str) -> tuple[CodedColumn, Array]:
        met = self.together.met.get(source) or Met(self.columns[source].column)
        values = self.columns[source].values
        return met.in_small(list(values.cat.categories) if isinstance(values.dtype, pd.CategoricalDtype) else [])

    def _keep_is_sound(self) -> bool:
        """Whether no column in the plan's condition is at fault. Raises: InputFault where it does not fit them."""
        condition = self.condition_of_keep()
        return condition is None or not any(self.columns[name].faults for name in condition.columns)


def _one_of_each(met: Met | None, edges: tuple[float, ...]) -> Array:
    """A number in each of the bands that are met; a band holds its lower edge."""
    if met is None or not edges:
        return NONE
    place = {level: at for at, level in enumerate(met.column.levels)}
    lower = np.concatenate([[np.nextafter(edges[0], -np.inf)], edges])
    found = [np.nan if value is None else lower[place[str(value)]] for value in met.values]
    return np.asarray(found, dtype=np.float64)
