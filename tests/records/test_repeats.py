"""One record a person: the first or last by an order, among those that are kept."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.errors import InputFault
from oddsmodel.plan.read import plan_from_values
from oddsmodel.records.accounting import account
from oddsmodel.records.load import records_from_frame
from oddsmodel.records.outcome import code_outcome
from oddsmodel.records.repeats import choose
from oddsmodel.records.types import Records
from oddsmodel.results.study import Flow

VISITS = pd.DataFrame(
    {
        "patient": ["a", "a", "b", "b", "b", "c", "d", "d", None],
        "admitted": [
            *("2024-01-05", "2024-02-01", "2024-03-01", "2024-01-01", "2024-02-01"),
            *("2024-01-01", "2024-01-01", None, "2024-05-05"),
        ],
        "visit": [1.0, 2, 3, 1, 2, 1, 1, 2, 1],
        "age": [50.0, 50, 17, 17, 18, 60, 70, 70, 80],
        "died": ["yes", "no", "no", "no", "yes", "no", "yes", "no", "no"],
        "smoker": ["yes", "no", "yes", "no", "no", "yes", "no", "yes", "no"],
    }
)


def loaded(frame: pd.DataFrame, repeats: Mapping[str, str], **more: Any) -> Records:
    values: dict[str, Any] = {
        "study": {"title": "t", "design": "cohort"},
        "records": {"source": "data frame", "repeats": dict(repeats), **more},
        "outcome": {"column": "died", "event": "yes"},
        "models": [{"name": "main", "formula": "died ~ smoker", "exposures": ["smoker"]}],
    }
    plan = plan_from_values(values).plan
    return records_from_frame(frame, plan)


def flow(records: Records, keep: list[str] | None = None) -> tuple[list[int], Flow]:
    outcome = code_outcome(records, plan_outcome())
    found = account(records, outcome, keep=keep or [], exposures=["smoker"], adjustment=[])
    return np.flatnonzero(found.included).tolist(), found.flow


def plan_outcome() -> Any:
    from oddsmodel.plan.schema import Outcome

    return Outcome(column="died", event="yes")


def test_the_first_by_date_is_used() -> None:
    used, found = flow(loaded(VISITS, {"of": "patient", "use": "first", "ordered_by": "admitted"}))
    assert used == [0, 3, 5]
    assert [(one.code, one.reason, one.records) for one in found.left_out] == [
        ("person-not-recorded", "Not recorded whose record it is: patient", 1),
        ("repeat-undecided", "Cannot be decided which record of the same patient is first: admitted not recorded", 2),
        ("repeat", "Later record of the same patient", 3),
    ]


def test_the_last_by_number_is_used() -> None:
    used, found = flow(loaded(VISITS, {"of": "patient", "use": "last", "ordered_by": "visit"}))
    assert used == [1, 2, 5, 7]
    assert found.left_out[-1].reason == "Earlier record of the same patient"


def test_the_choice_comes_after_keep() -> None:
    keep = "age >= 18"
    records = loaded(VISITS, {"of": "patient", "use": "first", "ordered_by": "visit"}, keep=keep)
    used, found = flow(records, [keep])
    assert used == [0, 4, 5, 6]
    assert [(one.code, one.records) for one in found.left_out] == [
        ("not-kept", 2),
        ("person-not-recorded", 1),
        ("repeat", 2),
    ]


def test_repeating_identifiers_do_not_stop_the_run() -> None:
    records = loaded(VISITS, {"of": "patient", "use": "first", "ordered_by": "visit"})
    assert not any(one.code == "identifier-repeats" for one in records.findings)


def test_records_alike_are_no_tie_and_others_are() -> None:
    twice = pd.concat([VISITS, VISITS.iloc[[0, 5]]], ignore_index=True)
    records = loaded(twice, {"of": "patient", "use": "first", "ordered_by": "visit"})
    assert flow(records)[0] == [0, 3, 5, 6]
    note = next(one for one in records.findings if one.code == "repeats-alike")
    assert note.facts["records"] == 2
    twice.loc[9, "smoker"] = "no"
    with pytest.raises(InputFault) as caught:
        loaded(twice, {"of": "patient", "use": "first", "ordered_by": "visit"})
    (fault,) = caught.value.faults
    assert fault.what.startswith("For 1 value of “patient” it cannot be told which record is first")
    assert "row 10" in fault.what


@pytest.mark.parametrize(
    ("repeats", "told"),
    [
        ({"of": "patnt", "use": "first", "ordered_by": "visit"}, "no column “patnt”"),
        ({"of": "patient", "use": "first", "ordered_by": "vist"}, "no column “vist”"),
        ({"of": "patient", "use": "first", "ordered_by": "smoker"}, "neither dates nor numbers"),
    ],
)
def test_faults_against_the_records(repeats: dict[str, str], told: str) -> None:
    with pytest.raises(InputFault, match=told):
        loaded(VISITS, repeats)


ROW = st.tuples(st.integers(-1, 4), st.one_of(st.just(np.nan), st.integers(0, 3).map(float)), st.booleans())


@settings(deadline=None, derandomize=True, max_examples=200)
@given(st.lists(st.tuples(ROW, st.integers(0, 1)), max_size=15), st.booleans())
def test_the_choice_said_person_by_person(rows: list[tuple[Any, int]], last: bool) -> None:
    person = np.array([row[0][0] for row in rows], dtype=np.intp)
    order = np.array([row[0][1] for row in rows], dtype=float)
    kept = np.array([row[0][2] for row in rows], dtype=bool)
    value = pd.Series([row[1] for row in rows], dtype=float)
    found = choose(person, order, kept, last=last, values=[value])
    undecided, others, alike, differing = (set[int]() for _ in range(4))
    for who in set(person[kept & (person >= 0)].tolist()):
        mine = [row for row in range(len(rows)) if kept[row] and person[row] == who]
        if len(mine) == 1:
            continue
        if any(np.isnan(order[row]) for row in mine):
            undecided |= set(mine)
            continue
        best = (max if last else min)(order[row] for row in mine)
        used = next(row for row in mine if order[row] == best)
        others |= set(mine) - {used}
        tied = [row for row in mine if order[row] == best and row != used]
        alike |= {row for row in tied if value[row] == value[used]}
        differing |= {row for row in tied if value[row] != value[used]}
    for mask, expected in zip(
        (found.undecided, found.others, found.alike, found.differing),
        (undecided, others, alike, differing),
        strict=True,
    ):
        assert set(np.flatnonzero(mask).tolist()) == expected
    assert (found.no_person == (kept & (person < 0))).all()
