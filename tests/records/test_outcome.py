"""The outcome: two values, and which of them is the event."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from oddsmodel.errors import InputFault
from oddsmodel.plan.schema import Outcome
from oddsmodel.records.outcome import code_outcome
from oddsmodel.records.types import Column, Records


def records(values: list[object], counts: list[float] | None = None) -> Records:
    series = pd.Series(values, dtype=float) if all(not isinstance(v, str) for v in values) else pd.Series(values)
    if series.dtype != np.float64:
        series = pd.Series(pd.Categorical(values))
    frame = pd.DataFrame({"died": series})
    weights = None if counts is None else pd.Series(counts, dtype=float)
    return Records(
        frame, {"died": Column("died", "category", "Died")}, len(frame), "people.csv", "0" * 64, counts=weights
    )


@pytest.mark.parametrize(
    ("values", "event", "labels"),
    [
        ([0.0, 1.0, None, 1.0], None, ("1", "0")),
        ([0.0, 1.0, None, 1.0], "1.0", ("1", "0")),
        ([0.0, 1.0, None, 1.0], "true", ("1", "0")),
        ([1.0, 0.0, None, 0.0], "0", ("0", "1")),
        (["no", "yes", None, "yes"], None, ("yes", "no")),
        (["no", "yes", None, "yes"], "1", ("yes", "no")),
        (["alive", "dead", None, "dead"], "dead", ("dead", "alive")),
        (["1", "2", None, "2"], "2.0", ("2", "1")),
        ([-1.5, 2.0, None, 2.0], "2", ("2", "-1.5")),
    ],
)
def test_the_event_in_every_spelling(values: list[object], event: str | None, labels: tuple[str, str]) -> None:
    coded = code_outcome(records(values), Outcome(column="died", event=event))
    assert coded.event.tolist() == [False, True, False, True]
    assert coded.recorded.tolist() == [True, True, False, True]
    assert (coded.event_label, coded.other_label, coded.column) == (*labels, "died")


def fault(values: list[object], event: str | None = None, counts: list[float] | None = None) -> str:
    with pytest.raises(InputFault) as caught:
        code_outcome(records(values, counts), Outcome(column="died", event=event))
    (found,) = caught.value.faults
    assert found.remedy
    return str(found)


def test_an_event_left_open_is_asked_for() -> None:
    message = fault(["alive", "dead"])
    assert 'event = "alive" or event = "dead"' in message
    assert "[outcome] event" in message
    assert "not said" in fault([1.0, 2.0])


def test_an_event_that_is_no_value() -> None:
    assert "Did you mean “dead”?" in fault(["alive", "dead"], "daed")
    assert "none of the outcome's values, “1” and “2”" in fault([1.0, 2.0], "0")


def test_three_values_are_listed_with_their_counts() -> None:
    message = fault(["a", "b", "b", "c", "c", "c"])
    assert "has 3: “c” (3 records), “b” (2 records) and “a” (1 record)" in message
    message = fault([0.0, 1.0, 9.0], counts=[5, 4, 30])
    assert "“9” (30 records), “0” (5 records) and “1” (4 records)" in message


def test_of_many_values_ten_are_listed() -> None:
    message = fault([float(number) for number in range(25)])
    assert "has 25" in message
    assert "and 15 other values" in message
    assert "“9”" in message


def test_one_value_or_none() -> None:
    assert "one value only" in fault([1.0, 1.0])
    assert "no recorded value" in fault([None, None])


def test_a_value_with_a_count_of_none_is_not_met() -> None:
    assert "one value only" in fault([0.0, 1.0], counts=[0, 3])


def test_a_column_that_is_absent() -> None:
    with pytest.raises(InputFault, match="Did you mean “died”"):
        code_outcome(records([0.0, 1.0]), Outcome(column="dead"))


def test_hostile_values_stay_on_one_line() -> None:
    message = fault(["a\nb\x1b[31m", "<b>", "c" * 500])
    assert "\n" not in message
    assert "\x1b" not in message
    assert len(message) < 600
