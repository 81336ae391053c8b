"""Records drawn again, or dealt into folds, as the design demands: single ones, groups, cases and controls apart."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.counted import CountedPeople
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.kept import KeptRecords
from oddsmodel.passes import Leaf

Array = NDArray[np.float64]
Counts = NDArray[np.signedinteger[Any]]
Index = NDArray[np.int64]

MOST_RECORDS = 10**9
"""Below this many records a number of them is dealt without replacement (a limit of numpy's)."""

WRITTEN_OUT = 4
"""Records up to so many times the cells are drawn one by one; more are drawn as counts of the cells."""


@dataclass(frozen=True)
class Groups:
    """Which of the cells the records of each group are in: group, cell and count (q,) each."""

    number: int
    group: Index
    cell: Index
    count: Counts


@dataclass(frozen=True)
class Cells:
    """counts (q,): how many of the records are in each cell. written_out: the cell of every record, unless too many."""

    counts: Counts
    records: int
    written_out: Index | None

    @classmethod
    def of(cls, counts: Counts) -> Cells:
        records = int(counts.sum())
        few = records <= WRITTEN_OUT * counts.size
        return cls(counts, records, np.repeat(np.arange(counts.size), counts) if few else None)


@dataclass(frozen=True)
class Population:
    """The records of m rows in 2m cells: those with the event by row, then those without it.

    cells (2m,): how many records each has. apart: whether records with and without the event are drawn apart.
    groups: where records belong to groups, which are then drawn whole.
    """

    cells: Counts
    apart: bool
    groups: Groups | None = None

    @property
    def rows(self) -> int:
        return self.cells.size // 2

    def counted(self, cells: Counts) -> tuple[Counts, Counts]:
        """Events and trials (..., m) of numbers of records by cell (..., 2m)."""
        events = cells[..., : self.rows]
        return events, events + cells[..., self.rows :]

    def drawn(self, rng: np.random.Generator) -> Counts:
        """As many records, or groups, drawn with replacement: how many are in each cell (2m,)."""
        if self.groups is not None:
            times = np.bincount(rng.integers(0, self.groups.number, self.groups.number), minlength=self.groups.number)
            return self._of_groups(times)
        return np.concatenate([_with_replacement(part, rng) for part in self._strata])

    def dealt(self, folds: int, rng: np.random.Generator) -> Counts:
        """All records dealt into folds of about equal size, each with about its share of the events (folds, 2m).

        Groups are dealt whole, as they come.
        """
        if self.groups is not None:
            fold = rng.permutation(self.groups.number) % folds
            return np.stack([self._of_groups(fold == one) for one in range(folds)])
        return np.concatenate([_dealt(part, folds, rng) for part in self._by_outcome], axis=1)

    @cached_property
    def _by_outcome(self) -> tuple[Cells, ...]:
        return Cells.of(self.cells[: self.rows]), Cells.of(self.cells[self.rows :])

    @cached_property
    def _strata(self) -> tuple[Cells, ...]:
        """What is drawn from separately."""
        return self._by_outcome if self.apart else (Cells.of(self.cells),)

    def _of_groups(self, times: NDArray[np.integer] | NDArray[np.bool_]) -> Counts:
        assert self.groups is not None
        weights = times[self.groups.group] * self.groups.count
        return np.bincount(self.groups.cell, weights=weights, minlength=self.cells.size).astype(np.int64)


def population_of_rows(model: FittedModel) -> Population:
    """The rows of a model as what is drawn from; they are few enough to hold a few numbers for each."""
    parts = list(model.rows.passes.each(_counts))
    events, trials = (np.concatenate([part[k] for part in parts]) for k in (0, 1))
    return _population(model, events, trials, None if model.grouping is None else model.grouped[1].index)


def population_of_records(model: FittedModel, names: Sequence[str]) -> tuple[Population, pd.DataFrame]:
    """Records as what is drawn from, and a row for each with these record columns: equal ones of one outcome together,
    in the order of their values, unless they belong to groups."""
    if model.grouping is not None:
        held, _ = model.grouped
        records, index = KeptRecords(held.frame[list(names)], held.event, held.counts), np.arange(held.event.size)
    else:
        records, index = CountedPeople(model.rows.people, model.rows.levels).of(*names), None
    trials = np.ones(records.event.size) if records.counts is None else records.counts
    return _population(model, trials * records.event, trials, index), records.frame


def _population(model: FittedModel, events: Array, trials: Array, index: NDArray[np.intp] | None) -> Population:
    """index (n,): the row of each record, where records belong to groups."""
    happened, counted = events.round().astype(np.int64), trials.round().astype(np.int64)
    cells = np.concatenate([happened, counted - happened])
    apart = model.study_design not in QUANTITY
    if model.grouping is None or index is None:
        return Population(cells, apart)
    held, _ = model.grouped
    cell = index + np.where(held.event, 0, events.size)
    count = np.ones(cell.size, dtype=np.int64) if held.counts is None else held.counts.round().astype(np.int64)
    return Population(cells, apart, Groups(model.grouping.number, model.grouping.codes, cell, count))


def _counts(rows: Leaf, first: int, state: None) -> tuple[Array, Array]:
    events = rows["events"]
    return events, rows.get("trials", np.ones_like(events))


def _with_replacement(cells: Cells, rng: np.random.Generator) -> Counts:
    if cells.written_out is not None:
        drawn = cells.written_out[rng.integers(0, cells.records, cells.records)]
        return np.bincount(drawn, minlength=cells.counts.size)
    filled = np.flatnonzero(cells.counts)
    number = np.zeros_like(cells.counts)
    number[filled] = rng.multinomial(cells.records, cells.counts[filled] / cells.records)
    return number


def _dealt(cells: Cells, folds: int, rng: np.random.Generator) -> Counts:
    size = cells.counts.size
    if cells.written_out is not None:
        place = (np.arange(cells.records) % folds) * size + rng.permutation(cells.written_out)
        return np.bincount(place, minlength=folds * size).reshape(folds, size)
    left = cells.counts.copy()
    dealt = np.zeros((folds, size), dtype=np.int64)
    for fold in range(folds - 1):
        share = -(-(cells.records - fold) // folds)
        dealt[fold] = rng.multivariate_hypergeometric(left, share, method="marginals")
        left -= dealt[fold]
    dealt[-1] = left
    return dealt
