"""The outcome that a plan makes from dates or a condition, as a column of the records."""

from __future__ import annotations

import datetime
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

from oddsmodel.errors import InputFault
from oddsmodel.plan.read import PlanFile, plan_from_values
from oddsmodel.progress import Silent
from oddsmodel.records.accounting import account
from oddsmodel.records.load import load_records, records_from_frame
from oddsmodel.records.outcome import code_outcome
from oddsmodel.results.study import Flow

DATES = {
    "start": "admitted",
    "event_date": "died_on",
    "followed_to": "last_seen",
    "within_days": 365,
    "extracted": datetime.date(2025, 3, 31),
}
STAYS = pd.DataFrame(
    {
        "admitted": [
            "2023-01-01",
            "2023-01-01",
            "2024-06-01",
            "2024-06-01",
            "2023-05-01",
            "2023-01-01",
            "",
            "2023-02-01",
        ],
        "died_on": ["2023-06-01", "", "2024-07-01", "", "2023-01-01", "", "2023-01-01", "2023-02-10"],
        "last_seen": ["2023-06-01", "2025-01-01", "2024-07-01", "2025-03-01", "", "2023-06-01", "", "2023-02-01"],
        "smoker": ["yes", "no", "yes", "no", "yes", "no", "yes", "no"],
    }
)


def plan_of(outcome: dict[str, Any], formula: str = "smoker") -> PlanFile:
    return plan_from_values(
        {
            "study": {"title": "t", "design": "cohort"},
            "records": {"source": "stays.csv"},
            "outcome": outcome,
            "models": [{"name": "main", "formula": formula, "exposures": ["smoker"]}],
        }
    )


def made(frame: pd.DataFrame, outcome: dict[str, Any]) -> tuple[Any, Any, Flow]:
    file = plan_of(outcome)
    records = records_from_frame(frame, file.plan)
    coded = code_outcome(records, file.plan.outcome)
    return records, coded, account(records, coded, keep=[], exposures=["smoker"], adjustment=[]).flow


def told(frame: pd.DataFrame, outcome: dict[str, Any]) -> list[str]:
    with pytest.raises(InputFault) as caught:
        records_from_frame(frame, plan_of(outcome).plan)
    return [f"{fault.where}: {fault.what}" for fault in caught.value.faults]


def test_the_accounting_of_an_outcome_from_dates() -> None:
    records, coded, flow = made(STAYS, {**DATES, "label": "Death within a year"})
    assert [(one.code, one.reason, one.records) for one in flow.left_out] == [
        ("start-not-recorded", "Start not recorded: admitted", 1),
        ("event-before-start", "Event before start: died_on is earlier than admitted", 1),
        ("window-not-finished", "Window not finished by extraction (2025-03-31)", 2),
        ("outcome-not-recorded", "Outcome not recorded: Death within a year", 1),
    ]
    assert (flow.read, flow.analysed, flow.events) == (8, 3, 2)
    assert coded.column == "outcome"
    assert records.columns["outcome"].label == "Death within a year"
    late = next(one for one in records.findings if one.code == "events-after-follow-up")
    assert late.facts["records"] == 1


def test_the_window_can_begin_anew() -> None:
    _, _, flow = made(STAYS, {**DATES, "from_day": 30, "name": "died"})
    assert [(one.code, one.records) for one in flow.left_out] == [
        ("start-not-recorded", 1),
        ("event-before-start", 1),
        ("window-not-finished", 2),
        ("event-before-window", 1),
        ("outcome-not-recorded", 1),
    ]
    assert (flow.analysed, flow.events) == (2, 1)


def test_extracted_may_be_a_text() -> None:
    assert plan_of({**DATES, "extracted": "2025-03-31"}).plan.outcome.extracted == datetime.date(2025, 3, 31)


def test_a_file_of_mixed_dates(tmp_path: Path) -> None:
    """Day first with points, year first with dashes, a byte-order mark, trailing spaces, a time of day."""
    path = tmp_path / "stays.csv"
    path.write_text(
        "\ufeffadmitted;died_on;last_seen;smoker\n"
        "01.02.2023;13.04.2023 ;2023-04-13;yes\n"
        "15.02.2023;;2024-06-01 08:30;no\n"
        "01.03.2023 ;;2024-06-01;yes\n",
        encoding="utf-8",
    )
    file = plan_of(DATES)
    records = load_records(path, file.plan, Silent())
    assert records.frame["outcome"].tolist() == ["yes", "no", "no"]


def test_faults_of_dates_are_told_together() -> None:
    frame = STAYS.assign(died_on="03/04/2023", last_seen=["soon", *STAYS.last_seen[1:]])
    faults = told(frame, DATES)
    assert len(faults) == 2
    assert "whether day or month comes first" in faults[0]
    assert "column “last_seen”" in faults[1]


def test_dates_after_extraction_are_a_fault() -> None:
    frame = STAYS.assign(died_on=["2025-04-01", *STAYS.died_on[1:]], last_seen=[*STAYS.last_seen[:-1], "2026-01-01"])
    assert told(frame, DATES) == [
        "data frame, column “died_on”: A date is later than the extraction (2025-03-31): row 1.",
        "data frame, column “last_seen”: A date is later than the extraction (2025-03-31): row 8.",
    ]


def test_a_start_after_extraction_is_a_window_not_finished() -> None:
    frame = STAYS.assign(admitted=["2025-04-05", *STAYS.admitted[1:]], died_on=["", *STAYS.died_on[1:]])
    _, _, flow = made(frame, DATES)
    assert next(one.records for one in flow.left_out if one.code == "window-not-finished") == 3


@pytest.mark.parametrize("key", ["start", "event_date", "followed_to"])
def test_columns_of_dates_that_are_not_there(key: str) -> None:
    (fault,) = told(STAYS, {**DATES, key: "admited"})
    assert fault == f"the plan, [outcome] {key}: The records have no column “admited”."


def test_an_outcome_that_is_known_of_nobody_or_always_the_same() -> None:
    (fault,) = told(STAYS.assign(died_on=""), DATES)
    assert "happened to none of the records whose outcome is known (1)" in fault
    (fault,) = told(STAYS.assign(admitted=""), DATES)
    assert "known of no record" in fault


def test_the_name_of_a_column_cannot_be_that_of_the_outcome() -> None:
    (fault,) = told(STAYS.assign(age="50"), {**DATES, "name": "age"})
    assert "called “age”, and so is a column" in fault


EITHER = {"event_when": "died == 'yes' or readmitted == 'yes'", "name": "bad_end"}


def test_a_condition_is_decided_in_three_values() -> None:
    frame = pd.DataFrame(
        {
            "died": ["yes", "yes", "no", "no", None, None, None, "no"],
            "readmitted": ["no", None, "no", None, "yes", "no", None, "yes"],
            "smoker": ["yes", "no"] * 4,
        }
    )
    records, coded, flow = made(frame, EITHER)
    # Truth table of "or" with an unknown part: Kleene 1952, section 64.
    assert records.frame["bad_end"].tolist() == ["yes", "yes", "no", np.nan, "yes", np.nan, np.nan, "yes"]
    assert (coded.event_label, coded.other_label) == ("yes", "no")
    assert [(one.code, one.records) for one in flow.left_out] == [("outcome-not-recorded", 3)]


def test_both_parts_are_needed_by_and() -> None:
    frame = pd.DataFrame(
        {"a": ["yes", "no", None, "yes", None], "b": ["yes", None, "no", None, "yes"], "smoker": list("xyxyx")}
    )
    records, _, _ = made(frame, {"event_when": "a == 'yes' and b == 'yes'"})
    assert records.frame["outcome"].tolist() == ["yes", "no", "no", np.nan, np.nan]


def test_faults_of_the_condition() -> None:
    frame = pd.DataFrame({"died": ["yes", "no"], "smoker": ["yes", "no"]})
    (fault,) = told(frame, {"event_when": "dead == 'yes'"})
    assert fault.startswith("the plan, [outcome] event_when, character 1")
    (fault,) = told(frame, {"event_when": "__import__('os')"})
    assert "event_when" in fault
    (fault,) = told(frame, {"event_when": "died is recorded"})
    assert "happened to each of the records whose outcome is known (2)" in fault


def test_grouped_records_count_as_many() -> None:
    frame = pd.DataFrame(
        {"died": ["yes", "no", "no"], "ill": ["no", "no", "yes"], "smoker": ["a", "b", "a"], "n": [3.0, 5, 0]}
    )
    values = {
        "study": {"title": "t", "design": "cohort"},
        "records": {"source": "x", "count": "n"},
        "outcome": {"event_when": "died == 'yes'"},
        "models": [{"name": "main", "formula": "smoker", "exposures": ["smoker"]}],
    }
    file = plan_from_values(values)
    records = records_from_frame(frame, file.plan)
    coded = code_outcome(records, file.plan.outcome)
    flow = account(records, coded, keep=[], exposures=["smoker"], adjustment=[]).flow
    assert (flow.read, flow.analysed, flow.events) == (8, 8, 3)
