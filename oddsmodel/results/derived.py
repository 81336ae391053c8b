"""A column made from others: how it was made."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from oddsmodel.results.tables import Table

Rule = Literal["bands_of", "years_between", "points", "groups_of", "quantile_groups_of"]


@dataclass(frozen=True, slots=True)
class DerivedColumn:
    """How a column was made: its rule as the plan calls it and in words, its sources, cut points found in the records.

    tables: the column counted beside its sources, among the records that the first model analyses.
    """

    name: str
    label: str
    kind: str
    rule: Rule
    told: str
    sources: tuple[str, ...]
    cut_points: tuple[float, ...] = ()
    tables: tuple[Table, ...] = ()
