"""Small differences between successive counts: none is shown, and none can be worked out."""

from __future__ import annotations

from itertools import combinations

from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.disclosure.differences import CountRow, withheld_differences


def test_counts_far_apart_are_shown_and_near_ones_are_not() -> None:
    rows = [CountRow("read", (1000, 1100, 1103, 1003))]
    assert withheld_differences(rows, 5) == {(0, 2): "near", (0, 3): "near"}
    assert withheld_differences(rows, 3) == {}
    assert withheld_differences(rows, 0) == {}


def test_counts_that_are_alike_are_not_told_from_near_ones() -> None:
    assert withheld_differences([CountRow("read", (1000, 1000))], 5) == {(0, 1): "near"}


def test_a_count_that_a_result_withholds_stays_as_it_is() -> None:
    assert withheld_differences([CountRow("read", (1000, None, 1002))], 5) == {(0, 2): "near"}


def test_the_last_unknown_of_a_sum_takes_another_with_it() -> None:
    rows = [
        CountRow("read", (1000, 1100), role="total"),
        CountRow("not kept", (7, 9), role="summand"),
        CountRow("outcome", (20, 60), role="summand"),
        CountRow("analysed", (973, 1031), role="summand"),
    ]
    # Otherwise 1100 - 60 - 1031 = 9, and 9 - 7 = 2 people.
    assert withheld_differences(rows, 5) == {(1, 1): "near", (2, 1): "with"}


def test_those_without_the_event_are_protected_too() -> None:
    rows = [CountRow("analysed", (1000, 1052)), CountRow("events", (300, 350), part_of=0)]
    # 700 and 702 without the event.
    assert withheld_differences(rows, 5) == {(1, 1): "near"}


def test_the_same_counts_in_another_row_do_not_tell_them() -> None:
    rows = [
        CountRow("read", (1000, 1100), role="total"),
        CountRow("not kept", (7, 9), role="summand"),
        CountRow("analysed", (993, 1091), role="summand"),
        CountRow("analysed by the other model", (993, 1091)),
    ]
    found = withheld_differences(rows, 5)
    assert found[2, 1] == "with"
    assert found[3, 1] == "with"


refreshes = st.integers(2, 4).flatmap(
    lambda columns: st.lists(
        st.tuples(
            *[st.integers(0, 40)] * 3,
            st.integers(200, 240),
            st.integers(80, 120),
        ),
        min_size=columns,
        max_size=columns,
    )
)


@settings(deadline=None, derandomize=True, max_examples=300)
@given(refreshes, st.integers(2, 8))
def test_no_small_difference_is_shown_or_is_the_only_unknown(
    counted: list[tuple[int, int, int, int, int]], threshold: int
) -> None:
    left_out = list(zip(*counted, strict=True))
    analysed, events = left_out[3], left_out[4]
    read = tuple(sum(row[:4]) for row in counted)
    rows = [
        CountRow("read", read, role="total"),
        *(CountRow(f"reason {n}", left_out[n], role="summand") for n in range(3)),
        CountRow("analysed", analysed, role="summand"),
        CountRow("events", events, part_of=4),
    ]
    withheld = withheld_differences(rows, threshold)
    for r, row in enumerate(rows):
        shown = [c for c in range(len(counted)) if (r, c) not in withheld]
        assert 0 in shown
        for one, other in combinations(shown, 2):
            assert abs(row.counts[one] - row.counts[other]) >= threshold  # type: ignore[operator]
    rest = [(c, analysed[c] - events[c]) for c in range(len(counted)) if {(4, c), (5, c)}.isdisjoint(withheld)]
    for (_, one), (_, other) in combinations(rest, 2):
        assert abs(one - other) >= threshold
    for c in range(len(counted)):
        unknown = [r for r in range(5) if (r, c) in withheld]
        assert len(unknown) != 1 or all(rows[r].counts[c] == 0 for r in range(5) if r not in unknown)
