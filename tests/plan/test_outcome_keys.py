"""The keys of an outcome that the plan makes, and of repeats: what belongs together and what does not."""

from __future__ import annotations

import datetime
import tomllib

import pytest

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.read import PlanFile, plan_from_values

DATES = """
start = "admitted"
event_date = "died_on"
followed_to = "last_seen"
within_days = 365
extracted = 2025-03-31
"""
REPEATS = 'repeats = {of = "patient", use = "first", ordered_by = "admitted"}'


def read(outcome: str, records: str = "", more: str = "", formula: str = "smoker") -> PlanFile:
    text = f"""
[study]
title = "t"
design = "cohort"
[records]
source = "r.csv"
{records}
[outcome]
{outcome}
[[models]]
name = "main"
formula = "{formula}"
exposures = ["smoker"]
{more}
"""
    return plan_from_values(tomllib.loads(text), "plan.toml")


def faults(outcome: str, records: str = "", more: str = "") -> list[Fault]:
    with pytest.raises(InputFault) as caught:
        read(outcome, records, more)
    return list(caught.value.faults)


def test_an_outcome_from_dates() -> None:
    outcome = read(DATES).plan.outcome
    assert outcome.extracted == datetime.date(2025, 3, 31)
    assert (outcome.column_name, outcome.from_day) == ("outcome", 0)
    assert outcome.dates == ("admitted", "died_on", "last_seen")
    assert read(DATES.replace("2025-03-31", '"2025-03-31"')).plan.outcome == outcome


def test_the_plan_written_again_reads_the_same() -> None:
    file = read(DATES + 'name = "died"', REPEATS)
    assert tomllib.loads(file.text)["outcome"]["extracted"] == datetime.date(2025, 3, 31)
    assert plan_from_values(tomllib.loads(file.text)).plan == file.plan
    assert file.plan.records.repeats is not None
    assert file.plan.records.repeats.use == "first"


def test_an_outcome_needs_a_way() -> None:
    (fault,) = faults('label = "Death"')
    assert fault.where == "plan.toml, [outcome]"
    assert "column" in fault.what


@pytest.mark.parametrize(
    ("outcome", "where", "told"),
    [
        ('column = "died"\nevent_when = "a == 1"', "[outcome]", "more than one way: column and event_when"),
        (f'column = "died"\n{DATES}', "[outcome]", "column and start"),
        ('start = "admitted"\nextracted = 2025-03-31', "[outcome]", "also needs event_date and within_days"),
        ('event_date = "died_on"', "[outcome]", "also needs start, within_days and extracted"),
        (f'{DATES}event = "yes"', "[outcome] event", "only beside column"),
        ('column = "died"\nfrom_day = 3', "[outcome] from_day", "only beside start"),
        ('column = "died"\nname = "x"', "[outcome] name", "only beside event_when or start"),
        (DATES.replace("last_seen", "admitted"), "[outcome]", "two of start, event_date and followed_to"),
        (DATES.replace("365", "0"), "[outcome] within_days", "outside the range from 1"),
        (DATES.replace("365", "1.5"), "[outcome] within_days", "whole number"),
        (DATES.replace("2025-03-31", '"31.03.2025"'), "[outcome] extracted", "is not a date"),
        (DATES.replace("2025-03-31", "20250331"), "[outcome] extracted", "is not a date"),
        (DATES.replace("2025-03-31", "2025-03-31T10:00:00"), "[outcome] extracted", "is not a date"),
    ],
)
def test_keys_that_do_not_go_together(outcome: str, where: str, told: str) -> None:
    (fault,) = faults(outcome)
    assert fault.where == f"plan.toml, {where}"
    assert told in fault.what


def test_a_column_of_dates_is_of_that_kind() -> None:
    (fault,) = faults(DATES, more='[columns.admitted]\nkind = "number"')
    assert fault.where == "plan.toml, [columns.admitted] kind"


def test_the_made_outcome_is_no_exposure() -> None:
    (fault,) = faults(DATES + 'name = "smoker"')
    assert "cannot be an exposure" in fault.what


@pytest.mark.parametrize(
    ("records", "where", "told"),
    [
        (REPEATS.replace("first", "frist"), "repeats, use", "frist"),
        (REPEATS.replace("use =", "uses ="), "repeats, uses", "Did you mean use?"),
        (REPEATS.replace('"admitted"', '"patient"'), "repeats", "both for the person and for the order"),
        (REPEATS.replace('"admitted"', '"died"'), "repeats", "must not depend on what happened"),
        (f'{REPEATS}\ncount = "n"', "repeats", "cannot be told apart by person"),
        ('repeats = "patient"', "repeats", "is the text"),
    ],
)
def test_faults_of_repeats(records: str, where: str, told: str) -> None:
    found = {fault.where: f"{fault.what} {fault.remedy}" for fault in faults('column = "died"', records)}
    assert told in found[f"plan.toml, [records] {where}"]


def test_the_order_is_of_dates_or_numbers() -> None:
    (fault,) = faults('column = "died"', REPEATS, '[columns.admitted]\nkind = "category"\nlevels = ["a", "b"]')
    assert fault.where == "plan.toml, [columns.admitted] kind"
