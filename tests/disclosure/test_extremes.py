"""The smallest and largest of some values in a shareable table."""

from __future__ import annotations

from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.disclosure.extremes import rounded_end
from oddsmodel.results.tables import Table, TableColumn

DOWN = TableColumn("smallest", "Smallest", "number", rounded="down", other_end="largest")
UP = TableColumn("largest", "Largest", "number", rounded="up", other_end="smallest")


def table(*rows: tuple[float | None, float | None], blocks: tuple[int, ...] = ()) -> Table:
    return Table("t", "T", (DOWN, UP), tuple(rows), blocks=blocks)


def test_ends_are_rounded_outwards_in_steps_of_the_whole_range() -> None:
    # The range 17.2 to 97.4 has twenty steps of 4.01, so that 5 is the step.
    found = table((17.2, 19.9), (40.1, 97.4), (None, None))
    assert [rounded_end(value, 0, DOWN, found) for value in (17.2, 40.1)] == [15.0, 40.0]
    assert [rounded_end(value, 0, UP, found) for value in (19.9, 97.4)] == [20.0, 100.0]


def test_what_every_record_shares_tells_of_no_one() -> None:
    found = table((1920.0, 2006.0), (2024.0, 2024.0), blocks=(0, 1))
    assert rounded_end(2024.0, 1, UP, found) == 2024.0
    assert rounded_end(1921.0, 0, DOWN, found) == 1920.0


def test_whole_numbers_are_told_by_twos() -> None:
    found = table((0.0, 0.0), (1.0, 2.0), (3.0, 7.0))
    assert [rounded_end(value, 2, UP, found) for value in (0.0, 2.0, 7.0)] == [0.0, 2.0, 8.0]
    assert rounded_end(3.0, 2, DOWN, found) == 2.0


@settings(deadline=None, derandomize=True, max_examples=200)
@given(st.floats(-1e6, 1e6), st.floats(0.001, 1e6))
def test_no_end_lies_inside_or_far_outside(smallest: float, width: float) -> None:
    largest = smallest + width
    found = table((smallest, largest))
    lower, upper = rounded_end(smallest, 0, DOWN, found), rounded_end(largest, 0, UP, found)
    if smallest.is_integer() and largest.is_integer() and width < 20:
        return
    slack = 1e-9 * max(abs(smallest), abs(largest), 1.0)
    assert smallest - 0.13 * width - slack <= lower <= smallest + slack
    assert largest - slack <= upper <= largest + 0.13 * width + slack
