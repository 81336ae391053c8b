"""Each record counted once, under the first reason that holds."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.errors import InputFault
from oddsmodel.plan.schema import Outcome
from oddsmodel.records.accounting import account
from oddsmodel.records.outcome import code_outcome
from oddsmodel.records.types import Column, Records

ROWS = [
    # died, age, smoker, ward, outside ward, count
    ("no", 10.0, "yes", "a", False, 1),  # not kept
    ("yes", np.nan, "yes", "a", False, 2),  # undecided
    (None, 40.0, None, None, False, 4),  # outcome not recorded, and more
    ("no", 41.0, None, None, False, 8),  # exposure not recorded, and more
    ("no", 42.0, "no", None, False, 16),  # adjustment not recorded
    ("yes", 43.0, "no", None, True, 32),  # level not in the plan
    ("yes", 44.0, "yes", "a", False, 64),
    ("no", 45.0, "no", "b", False, 128),
    (None, 10.0, None, None, True, 256),  # not kept, and every other reason
]


def records(rows: list[tuple[object, ...]], counted: bool = False) -> Records:
    died, age, smoker, ward, outside, counts = zip(*rows, strict=True)
    frame = pd.DataFrame(
        {
            "died": pd.Categorical(died, categories=["no", "yes"]),
            "age": np.asarray(age, dtype=float),
            "smoker": pd.Categorical(smoker, categories=["no", "yes"]),
            "ward": pd.Categorical(ward, categories=["a", "b"]),
        }
    )
    columns = {
        "died": Column("died", "yes-no", "Death", levels=("no", "yes")),
        "age": Column("age", "number", "Age"),
        "smoker": Column("smoker", "yes-no", "Smoking", levels=("no", "yes")),
        "ward": Column("ward", "category", "Ward", levels=("a", "b"), other_levels="exclude and count"),
    }
    return Records(
        frame,
        columns,
        read=int(sum(counts)) if counted else len(rows),  # type: ignore[arg-type]
        source="people.csv",
        sha256="",
        counts=pd.Series(counts, dtype=float) if counted else None,
        outside_levels={"ward": pd.Series(outside, dtype=bool)},
    )


def test_each_record_under_its_first_reason() -> None:
    data = records(ROWS)
    found = account(
        data,
        code_outcome(data, Outcome(column="died")),
        keep=["age >= 18"],
        exposures=["smoker"],
        adjustment=["age", "ward"],
    )
    assert [(exclusion.code, exclusion.reason, exclusion.records) for exclusion in found.flow.left_out] == [
        ("not-kept", "Not among those the plan keeps: age >= 18", 2),
        ("keep-undecided", "Cannot be decided whether they are kept: not recorded in Age", 1),
        ("outcome-not-recorded", "Outcome not recorded: Death", 1),
        ("exposure-not-recorded", "Exposure not recorded: Smoking", 1),
        ("adjustment-not-recorded", "Adjustment column not recorded: Ward", 1),
        ("level-not-in-plan", "Level not in the plan: Ward", 1),
    ]
    assert (found.flow.read, found.flow.analysed, found.flow.events) == (9, 2, 1)
    assert np.flatnonzero(found.included).tolist() == [6, 7]


def test_counts_multiply_records() -> None:
    data = records(ROWS, counted=True)
    found = account(
        data, code_outcome(data, Outcome(column="died")), keep=["age >= 18"], exposures=["smoker"], adjustment=["ward"]
    )
    assert [exclusion.records for exclusion in found.flow.left_out] == [257, 2, 4, 8, 16, 32]
    assert (found.flow.read, found.flow.analysed, found.flow.events) == (511, 192, 64)


def test_without_conditions_and_missing_values_nobody_is_left_out() -> None:
    data = records(ROWS[6:8])
    found = account(
        data, code_outcome(data, Outcome(column="died")), keep=[], exposures=["smoker"], adjustment=["ward"]
    )
    assert found.flow.left_out == ()
    assert found.included.all()


def test_several_conditions_must_all_hold() -> None:
    data = records(ROWS)
    outcome = code_outcome(data, Outcome(column="died"))
    two = account(data, outcome, keep=["age >= 18", 'smoker == "yes"'], exposures=["smoker"], adjustment=[])
    one = account(data, outcome, keep=['age >= 18 and smoker == "yes"'], exposures=["smoker"], adjustment=[])
    assert two.included.tolist() == one.included.tolist()
    assert [found.records for found in two.flow.left_out] == [found.records for found in one.flow.left_out]
    assert two.flow.left_out[0].reason.endswith('age >= 18 and smoker == "yes"')
    assert two.flow.left_out[1].reason.endswith("not recorded in Age or Smoking")


def test_an_outcome_level_that_is_not_in_the_plan_is_told_as_such() -> None:
    rows = [("yes", 40.0, "yes", "a", False, 1), ("no", 40.0, "yes", "a", False, 1), (None, 40.0, "yes", "a", False, 1)]
    data = records(rows)
    data = Records(
        data.frame, data.columns, 3, "people.csv", "", outside_levels={"died": pd.Series([False, False, True])}
    )
    found = account(data, code_outcome(data, Outcome(column="died")), keep=[], exposures=["smoker"], adjustment=[])
    assert [(exclusion.code, exclusion.records) for exclusion in found.flow.left_out] == [("level-not-in-plan", 1)]


def test_a_condition_that_does_not_fit_is_a_fault() -> None:
    data = records(ROWS)
    with pytest.raises(InputFault, match="agee"):
        account(data, code_outcome(data, Outcome(column="died")), keep=["agee > 1"], exposures=[], adjustment=[])


ROW = st.tuples(
    st.sampled_from(["no", "yes", None]),
    st.sampled_from([10.0, 30.0, np.nan]),
    st.sampled_from(["no", "yes", None]),
    st.sampled_from(["a", "b", None]),
    st.booleans(),
    st.integers(1, 9),
).map(lambda row: (*row[:3], None if row[4] else row[3], *row[4:]))


@settings(deadline=None, derandomize=True, max_examples=150)
@given(
    st.lists(ROW, max_size=25),
    st.booleans(),
    st.lists(
        st.sampled_from(["age >= 18", 'ward == "a"', 'smoker == "no" or age < 18', "ward is recorded"]), max_size=3
    ),
    st.sampled_from([(["smoker"], ["age", "ward"]), (["ward"], []), (["smoker", "ward"], ["ward"])]),
)
def test_everybody_is_counted_once(
    rows: list[tuple[object, ...]], counted: bool, keep: list[str], columns: tuple[list[str], list[str]]
) -> None:
    data = records([*rows, *ROWS[6:8]], counted)
    outcome = code_outcome(data, Outcome(column="died"))
    exposures, adjustment = columns
    flow = account(data, outcome, keep=keep, exposures=exposures, adjustment=adjustment).flow
    left_out = [exclusion.records or 0 for exclusion in flow.left_out]
    assert flow.analysed is not None
    assert flow.events is not None
    assert sum(left_out) + flow.analysed == flow.read
    assert all(number > 0 for number in left_out)
    assert 0 <= flow.events <= flow.analysed
    included = account(data, outcome, keep=keep, exposures=exposures, adjustment=adjustment).included
    analysed = data.frame.loc[included, ["died", *exposures, *adjustment]]
    assert not analysed.isna().any(axis=None)
