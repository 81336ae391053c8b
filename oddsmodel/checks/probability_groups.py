"""Records put in order of their fitted probability, and cut into groups that never split equal probabilities."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit

from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.tables import Cell, Table, TableColumn

Array = NDArray[np.float64]

TIE = 1e-10
"""Linear predictors closer than this, relative to the largest or to 1, are one fitted probability."""


@dataclass(frozen=True)
class OrderedRecords:
    """Records by distinct fitted probability, rising: all (j,).

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

    def summed(self, group: NDArray[np.int64]) -> OrderedRecords:
        """The same sums over groups (j,) numbered 0, 1, ... in order without a gap."""
        count = int(group[-1]) + 1

        def total(values: Array) -> Array:
            return np.bincount(group, weights=values, minlength=count).astype(np.float64)

        return OrderedRecords(
            records=total(self.records),
            events=total(self.events),
            expected=total(self.expected),
            unexpected=total(self.unexpected),
            variance=total(self.variance),
            fourth=total(self.fourth),
        )


def ordered_records(model: FittedModel) -> OrderedRecords:
    """The records of a fit by rising fitted probability; equal probabilities are one entry. O(m log m)."""
    linear = model.patterns.X @ model.fit.coefficients
    order = np.argsort(linear, kind="stable")
    order = order[model.patterns.trials[order] > 0.0]
    linear = linear[order]
    trials, events = model.patterns.trials[order], model.patterns.events[order]
    apart = np.diff(linear, prepend=linear[0]) > TIE * max(1.0, float(np.abs(linear).max()))
    block = np.cumsum(apart, dtype=np.int64)
    probability, complement = expit(linear), expit(-linear)
    spread = probability * complement
    single = OrderedRecords(
        trials, events, trials * probability, trials * complement, trials * spread, trials * spread * (1 - 6 * spread)
    )
    return single.summed(block)


def group_numbers(records: Array, groups: int) -> NDArray[np.int64]:
    """The group of each entry (j,), numbered 0, 1, ... without a gap, for at most `groups` about equal groups.

    Entry j, with t_j records after c_j others, goes where its middle lies: to group floor(groups·(c_j + t_j/2)/n).
    Fewer groups are formed where an entry spans several.
    """
    before = np.cumsum(records) - records
    place = np.floor(groups * (2.0 * before + records) / (2.0 * records.sum()))
    return np.cumsum(np.diff(place, prepend=place[0]) > 0, dtype=np.int64)


def grouped(ordered: OrderedRecords, groups: int) -> OrderedRecords:
    """At most `groups` groups of about equal numbers of records; equal fitted probabilities stay together."""
    return ordered.summed(group_numbers(ordered.records, groups))


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
