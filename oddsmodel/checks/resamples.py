"""Records drawn again, or dealt into folds, as their design demands: one by one, by groups, cases and controls apart."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
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
        if not self.apart:
            return _with_replacement(self.cells, rng)
        return np.concatenate([_with_replacement(part, rng) for part in self._by_outcome()])

    def dealt(self, folds: int, rng: np.random.Generator) -> Counts:
        """All records dealt into folds of about equal size, each with about its share of the events (folds, 2m).

        Groups are dealt whole, as they come.
        """
        if self.groups is not None:
            fold = rng.permutation(self.groups.number) % folds
            return np.stack([self._of_groups(fold == one) for one in range(folds)])
        return np.concatenate([_dealt(part, folds, rng) for part in self._by_outcome()], axis=1)

    def _by_outcome(self) -> tuple[Counts, Counts]:
        return self.cells[: self.rows], self.cells[self.rows :]

    def _of_groups(self, times: NDArray[np.integer] | NDArray[np.bool_]) -> Counts:
        assert self.groups is not None
        weights = times[self.groups.group] * self.groups.count
        return np.bincount(self.groups.cell, weights=weights, minlength=self.cells.size).astype(np.int64)


def population_of(model: FittedModel) -> Population:
    """What is drawn from for a model, its rows being few enough to hold a few numbers for each."""
    parts = list(model.rows.passes.each(_counts))
    events, trials = (np.concatenate([part[k] for part in parts]).round().astype(np.int64) for k in (0, 1))
    cells = np.concatenate([events, trials - events])
    apart = model.study_design not in QUANTITY
    if model.grouping is None:
        return Population(cells, apart)
    held, patterns = model.grouped
    cell = patterns.index + np.where(held.event, 0, events.size)
    count = np.ones(cell.size, dtype=np.int64) if held.counts is None else held.counts.round().astype(np.int64)
    return Population(cells, apart, Groups(model.grouping.number, model.grouping.codes, cell, count))


def _counts(rows: Leaf, first: int, state: None) -> tuple[Array, Array]:
    events = rows["events"]
    return events, rows.get("trials", np.ones_like(events))


def _written_out(cells: Counts) -> Index:
    return np.repeat(np.arange(cells.size), cells)


def _with_replacement(cells: Counts, rng: np.random.Generator) -> Counts:
    records = int(cells.sum())
    if records <= WRITTEN_OUT * cells.size:
        return np.bincount(_written_out(cells)[rng.integers(0, records, records)], minlength=cells.size)
    filled = np.flatnonzero(cells)
    drawn = np.zeros_like(cells)
    drawn[filled] = rng.multinomial(records, cells[filled] / records)
    return drawn


def _dealt(cells: Counts, folds: int, rng: np.random.Generator) -> Counts:
    records = int(cells.sum())
    if records <= WRITTEN_OUT * cells.size:
        order = rng.permutation(_written_out(cells))
        place = (np.arange(records) % folds) * cells.size + order
        return np.bincount(place, minlength=folds * cells.size).reshape(folds, cells.size)
    left = cells.copy()
    dealt = np.zeros((folds, cells.size), dtype=np.int64)
    for fold in range(folds - 1):
        share = -(-(records - fold) // folds)
        dealt[fold] = rng.multivariate_hypergeometric(left, share, method="marginals")
        left -= dealt[fold]
    dealt[-1] = left
    return dealt
