"""`draft`: a starter plan on standard output or in a new file."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from oddsmodel.plan.read import read_plan

Command = Callable[..., Any]


@pytest.fixture
def records(tmp_path: Path) -> Path:
    rows = [f"r{n:04},{20 + n % 60},{('f', 'm')[n % 2]},{('no', 'yes')[n % 5 == 0]},{n % 3}" for n in range(200)]
    path = tmp_path / "data" / "records.csv"
    path.parent.mkdir()
    path.write_text("\n".join(["record,age,sex,died,parity", *rows, "r9999,NA,f,no,1"]) + "\n", encoding="utf-8")
    return path


def test_a_draft_on_standard_output_is_a_plan(command: Command, records: Path, tmp_path: Path) -> None:
    ended = command("draft", records, "--outcome", "died")
    assert ended.status == 0
    assert ended.err == ""
    path = tmp_path / "plan.toml"
    path.write_text(ended.out, encoding="utf-8")
    plan = read_plan(path).plan
    assert plan.records.source == str(records)
    assert plan.outcome.event == "yes"
    assert plan.columns["record"].kind == "identifier"
    assert plan.columns["age"].kind == "number"
    assert plan.columns["age"].not_recorded == ("", "NA")
    assert plan.columns["sex"].levels == ("f", "m")
    assert plan.models[0].exposures == ("age",)


def test_a_draft_in_a_file_names_the_records_from_there(command: Command, records: Path, tmp_path: Path) -> None:
    into = tmp_path / "plans.d" / "plan.toml"
    ended = command("draft", records, "--outcome", "died", "--into", into)
    assert ended.status == 2
    assert "Make the folder first" in ended.err
    into.parent.mkdir()
    ended = command("draft", records, "--outcome", "died", "--into", into)
    assert ended.status == 0
    assert ended.out == ""
    assert f"{into} is written" in ended.err
    assert read_plan(into).plan.records.source == "../data/records.csv"


def test_what_is_there_is_never_overwritten(command: Command, records: Path, tmp_path: Path) -> None:
    into = tmp_path / "plan.toml"
    into.write_text("mine", encoding="utf-8")
    ended = command("draft", records, "--outcome", "died", "--into", into)
    assert ended.status == 2
    assert "not overwritten" in ended.err
    assert into.read_text(encoding="utf-8") == "mine"


def test_an_outcome_that_is_no_column(command: Command, records: Path) -> None:
    ended = command("draft", records, "--outcome", "dide")
    assert ended.status == 2
    assert "Did you mean “died”?" in ended.err


def test_records_that_are_not_there(command: Command, tmp_path: Path) -> None:
    ended = command("draft", tmp_path / "nowhere.csv", "--outcome", "died")
    assert ended.status == 2
    assert "Traceback" not in ended.err


def test_an_outcome_whose_event_is_open(command: Command, records: Path) -> None:
    ended = command("draft", records, "--outcome", "sex")
    assert ended.status == 0
    assert "Which value of “sex” is the event?" in ended.out
    assert "\nevent = " not in ended.out
    ended = command("draft", records, "--outcome", "parity")
    assert "“parity” must have exactly two values" in ended.out
