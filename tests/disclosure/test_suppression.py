"""Hidden counts in single tables against an attacker that solves integer programs, and against hand-made cases."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import Bounds, LinearConstraint, milp

from oddsmodel.disclosure.feasible import Equation, feasible_bounds
from oddsmodel.disclosure.suppression import Suppression
from oddsmodel.disclosure.system import CountSystem
from oddsmodel.disclosure.table_counts import Sightings, TableCounts
from oddsmodel.results.tables import Table, TableColumn


@dataclass
class Levels:
    """A 2×k table (records and events by level, totals printed elsewhere) and which of its cells are hidden."""

    records: list[int]
    events: list[int]
    hidden_records: list[bool]
    hidden_events: list[bool]
    hidden_totals: tuple[bool, bool]


def suppressed(records: list[int], events: list[int], threshold: int) -> Levels:
    columns = (
        TableColumn("label", "Level"),
        TableColumn("records", "Records", "count", sums_known=True),
        TableColumn("events", "Events", "count", part_of="records", sums_known=True),
    )
    rows = tuple((f"level {k}", n, e) for k, (n, e) in enumerate(zip(records, events, strict=True)))
    table = Table("levels", "Levels", columns, rows)
    system = CountSystem()
    all_records = system.add(sum(records), ("records",), rank=5)
    all_events = system.add(sum(events), ("events",), rank=4)
    others = system.add(sum(records) - sum(events), rank=4)
    system.relate([all_events, others], all_records)
    scalars = {sum(records) - sum(events): others, sum(events): all_events} | {sum(records): all_records}
    TableCounts(system, Sightings(), table, ("t",), scalars, 0).enter()
    counts = system.freeze()
    hidden = Suppression(counts, threshold).run()

    def is_hidden(*place: object) -> bool:
        return counts.places[place] in hidden

    return Levels(
        records,
        events,
        [is_hidden("cell", ("t",), k, 1) for k in range(len(rows))],
        [is_hidden("cell", ("t",), k, 2) for k in range(len(rows))],
        (is_hidden("records"), is_hidden("events")),
    )


def attack(table: Levels, hints: int | None = None) -> list[tuple[int, int, int]]:
    """True value, smallest and largest value of events and other records by level, where these are not shown.

    Unknowns: events then others by level. hints: the threshold, where the attacker is told of every hidden count
    whether it is under it.
    """
    k = len(table.records)
    others = [n - e for n, e in zip(table.records, table.events, strict=True)]
    rows, values = [], []

    def told(weights: np.ndarray, value: int) -> None:
        rows.append(weights)
        values.append(float(value))

    unit = np.eye(2 * k)
    for level in range(k):
        if not table.hidden_records[level]:
            told(unit[level] + unit[k + level], table.records[level])
        if not table.hidden_events[level]:
            told(unit[level], table.events[level])
    if not table.hidden_totals[0]:
        told(np.ones(2 * k), sum(table.records))
    if not table.hidden_totals[1]:
        told(np.repeat([1.0, 0.0], k), sum(table.events))
    true = np.array(table.events + others)
    lower, upper = np.zeros(2 * k), np.full(2 * k, 10.0**6)
    if hints is not None:
        small = true < hints
        lower = np.where(small, 0.0, hints)
        upper = np.where(small, hints - 1.0, upper)
    found = []
    constraint = LinearConstraint(np.array(rows), values, values) if rows else ()
    for number in range(2 * k):
        ends = []
        for sign in (1.0, -1.0):
            answer = milp(
                sign * unit[number],
                constraints=constraint,
                bounds=Bounds(lower, upper),
                integrality=np.ones(2 * k, dtype=np.uint8),
            )
            assert answer.x is not None
            ends.append(round(sign * answer.fun))
        found.append((int(true[number]), ends[0], ends[1]))
    return found


counts = st.one_of(st.integers(0, 12), st.integers(0, 400))


@settings(deadline=None, derandomize=True, max_examples=120)
@given(levels=st.lists(st.tuples(counts, counts), min_size=2, max_size=6), threshold=st.integers(4, 11))
def test_no_small_count_of_a_table_with_known_totals_can_be_worked_out(
    levels: list[tuple[int, int]], threshold: int
) -> None:
    events, others = [e for e, _ in levels], [o for _, o in levels]
    records = [e + o for e, o in levels]
    table = suppressed(records, events, threshold)
    for value, hidden in (
        *zip(records, table.hidden_records, strict=True),
        *zip(events, table.hidden_events, strict=True),
    ):
        assert hidden or not 0 < value < threshold
    # Where all records together are few of either kind, even hiding everything leaves a total that is small.
    if min(sum(events), sum(others)) < threshold:
        return
    for true, lowest, highest in attack(table):
        if 0 < true < threshold:
            assert lowest < highest
            assert highest >= threshold
    for true, lowest, highest in attack(table, hints=threshold):
        if 0 < true < threshold:
            assert lowest < highest


def test_a_small_count_alone_takes_the_next_smallest_with_it() -> None:
    table = suppressed([100, 200, 300], [3, 30, 60], 5)
    assert table.hidden_events == [True, True, False]
    assert table.hidden_records == [False, False, False]
    assert table.hidden_totals == (False, False)


def test_small_counts_that_hide_each_other_take_nothing_with_them() -> None:
    table = suppressed([100, 200, 300], [3, 4, 60], 5)
    assert table.hidden_events == [True, True, False]


def test_the_complement_of_events_is_protected() -> None:
    """98 of 100 had the event: the two that had not follow from the counts shown."""
    table = suppressed([100, 200, 300], [98, 30, 60], 5)
    assert table.hidden_events[0] or table.hidden_records[0]
    for true, lowest, highest in attack(table):
        if 0 < true < 5:
            assert lowest < highest
            assert highest >= 5


def test_zero_is_shown_unless_it_gives_a_count_away() -> None:
    assert suppressed([100, 200, 300], [0, 30, 60], 5).hidden_events == [False, False, False]
    # 8 events in all, 4 and 4 and none: with the zero shown, each of the others is at most 4, so exactly 4.
    table = suppressed([100, 200, 300], [4, 4, 0], 5)
    assert table.hidden_events[:2] == [True, True]
    assert table.hidden_events[2] or table.hidden_totals[1]


def test_nothing_is_hidden_where_nothing_is_small() -> None:
    table = suppressed([100, 200], [20, 30], 5)
    assert not any((*table.hidden_records, *table.hidden_events, *table.hidden_totals))


@settings(deadline=None, derandomize=True, max_examples=60)
@given(data=st.data())
def test_feasible_bounds_against_enumeration(data: st.DataObject) -> None:
    """Every combination of small whole numbers is tried; those that satisfy the equations give the true bounds."""
    size = data.draw(st.integers(2, 5))
    truth = data.draw(st.lists(st.integers(0, 4), min_size=size, max_size=size))
    equations = []
    for _ in range(data.draw(st.integers(1, 3))):
        terms = data.draw(
            st.dictionaries(st.integers(0, size - 1), st.sampled_from([-1, 1]), min_size=1, max_size=size)
        )
        equations.append(Equation(terms, sum(sign * truth[number] for number, sign in terms.items())))
    solutions = [
        point
        for point in itertools.product(range(7), repeat=size)
        if all(sum(s * point[n] for n, s in e.terms.items()) == e.constant for e in equations)
    ]
    wanted = sorted({number for equation in equations for number in equation.terms})
    found = feasible_bounds(equations, lambda number: (0, 6), wanted, truth, lambda number, bounds: False)
    for number in wanted:
        values = [point[number] for point in solutions]
        assert found[number] == (min(values), max(values))


def test_counts_that_are_told_to_be_the_same_must_be_equal() -> None:
    system = CountSystem()
    with pytest.raises(ValueError, match="two different counts"):
        system.merge(system.add(1), system.add(2))
    with pytest.raises(ValueError, match="do not add up"):
        system.relate([system.add(1)], system.add(3))
