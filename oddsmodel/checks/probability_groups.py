"""Records put in order of their fitted probability, and cut into groups that never split equal probabilities."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, fields
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import Leaf, Passes
from oddsmodel.results.tables import Cell, Table, TableColumn

Array = NDArray[np.float64]

TENTHS = 10

TIE = 1e-10
"""Linear predictors closer than this, relative to the largest or to 1, are one fitted probability."""

MOST_SORTED = 1 << 20
"""Rows up to which every fitted probability keeps its own place; more are counted in classes."""

CLASSES = 1 << 20
"""Classes of equal width of the linear predictor."""

STEEPEST = 40.0
"""Linear predictors beyond this, either way, are in the outermost classes: probabilities of 0 or 1 but for 4e-18."""


@dataclass(frozen=True)
class OrderedRecords:
    """Records by distinct fitted probability, or by narrow class of it, rising: all (j,).

    records, events: true frequencies. expected: sum of the fitted probabilities; unexpected: of their complements.
    variance: sum of p(1 − p). fourth: sum of the fourth cumulants p(1 − p)(1 − 6p(1 − p)) of the records' outcomes.
    """

    records: Array
    events: Array
    expected: Array
    unexpected: Array
    variance: Array
    fourth: Array

    @property
    def probability(self) -> Array:
        """Mean fitted probability of each."""
        return self.expected / self.records

    @cached_property
    def tenths(self) -> OrderedRecords:
        """At most ten groups of about equal numbers of records."""
        return grouped(self, TENTHS)

    def summed(self, starts: NDArray[np.int64]) -> OrderedRecords:
        """The same sums over groups of neighbours, each from one of the rising starts, the first 0, to the next."""
        if starts.size == self.records.size:
            return self
        return OrderedRecords(*(np.add.reduceat(getattr(self, field.name), starts) for field in fields(self)))


def sorted_records(rows: Leaf) -> OrderedRecords:
    """Rows by their rising "linear" predictor; those of equal fitted probability together.

    rows: "linear", "events" and, unless all are 1, "trials" above 0, each (m,).
    """
    linear, events, trials = rows["linear"], rows["events"], rows.get("trials")
    if trials is None:
        linear, events = _sorted_with_outcome(linear, events)
        trials = np.ones_like(linear)
    else:
        order = np.argsort(linear, kind="stable")
        linear, events, trials = linear[order], events[order], trials[order]
    least = TIE * max(1.0, abs(float(linear[0])), abs(float(linear[-1])))
    starts = np.flatnonzero(np.diff(linear, prepend=-np.inf) > least)
    return _single(linear, events, trials).summed(starts)


def _sorted_with_outcome(linear: Array, event: Array) -> tuple[Array, Array]:
    """Linear predictors in order with their outcomes, 0 or 1, which travel in the last binary digit."""
    bits = linear.view(np.uint64) & ~np.uint64(1)
    bits |= event.astype(np.uint64)
    in_order = np.sort(bits.view(np.float64))
    return in_order, (in_order.view(np.uint64) & np.uint64(1)).astype(np.float64)


def _single(linear: Array, events: Array, trials: Array) -> OrderedRecords:
    small, whole, probability = logistic(linear)
    complement = np.maximum(small, linear < 0.0) / whole
    spread = probability * complement
    return OrderedRecords(
        trials, events, trials * probability, trials * complement, trials * spread, trials * spread * (1 - 6 * spread)
    )


@dataclass(frozen=True)
class _Classes:
    """Sums over the rows of a task by class of the linear predictor, from `low` in steps of `width`."""

    coefficients: Array
    low: float
    width: float
    number: int

    def __call__(self, rows: Leaf, first: int, state: None) -> tuple[NDArray[np.int64], OrderedRecords]:
        linear = rows["X"] @ self.coefficients
        trials = rows["trials"] if "trials" in rows else np.ones_like(linear)
        place = np.clip((linear - self.low) / self.width, 0.0, self.number - 1.0).astype(np.int64)
        order = np.argsort(place)
        place = place[order]
        starts = np.flatnonzero(np.diff(place, prepend=-1))
        single = _single(linear[order], rows["events"][order], trials[order])
        return place[starts], single.summed(starts)


def classed_records(passes: Passes, coefficients: Array, low: float, high: float, classes: int) -> OrderedRecords:
    """The rows of a pass in classes of their linear predictor, which lies between low and high; one more pass."""
    low, high = max(low, -STEEPEST), min(high, STEEPEST)
    width = (high - low) / classes if high > low else 1.0
    return _added(passes.each(_Classes(coefficients, low, width, classes)), classes)


def _added(parts: Iterable[tuple[NDArray[np.int64], OrderedRecords]], classes: int) -> OrderedRecords:
    names = [field.name for field in fields(OrderedRecords)]
    totals = np.zeros((len(names), classes))
    for places, sums in parts:
        for total, name in zip(totals, names, strict=True):
            total[places] += getattr(sums, name)
    return OrderedRecords(*totals[:, totals[0] > 0.0])


def group_starts(records: Array, groups: int) -> NDArray[np.int64]:
    """Where each of at most `groups` about equal groups of entries (j,) starts.

    Entry j, with t_j records after c_j others, goes where its middle lies: to group floor(groups·(c_j + t_j/2)/n).
    Fewer groups are formed where an entry spans several.
    """
    middle = 2.0 * np.cumsum(records) - records
    edges = 2.0 * float(records.sum()) * np.arange(groups)
    starts = np.unique(np.searchsorted(groups * middle, edges))
    return starts[starts < records.size]


def grouped(ordered: OrderedRecords, groups: int) -> OrderedRecords:
    """At most `groups` groups of about equal numbers of records; equal fitted probabilities stay together."""
    return ordered.summed(group_starts(ordered.records, groups))


def group_table(groups: OrderedRecords, *, cases: bool) -> Table:
    """Observed and expected counts by group of fitted probability; `cases`: a design that shows no risk."""
    both = ("records", "events")
    name = "Cases" if cases else "Events"
    columns = [
        TableColumn("group", "Group, from low to high"),
        TableColumn("records", "Records", "count", sums_known=True),
        TableColumn("events", f"{name} observed", "count", part_of="records", sums_known=True),
        TableColumn("expected", f"{name} expected", "number", hidden_with=both),
    ]
    if not cases:
        columns.append(TableColumn("expected_per_100", "Expected per 100", "number", hidden_with=both))
        columns.append(TableColumn("observed_per_100", "Observed per 100", "number", hidden_with=both))
    rows: list[tuple[Cell, ...]] = []
    for number in range(groups.records.size):
        records, events = round(float(groups.records[number])), round(float(groups.events[number]))
        expected = float(groups.expected[number])
        shares = () if cases else (100.0 * expected / records, 100.0 * events / records)
        rows.append((str(number + 1), records, events, expected, *shares))
    return Table(
        "groups_of_fitted_probability", "Observed and expected, by fitted probability", tuple(columns), tuple(rows)
    )
