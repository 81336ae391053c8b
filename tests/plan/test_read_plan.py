"""Plans that can be read, and files that cannot."""

from __future__ import annotations

import hashlib
from pathlib import Path

import pytest

from oddsmodel.errors import InputFault
from oddsmodel.plan.read import plan_from_values, read_plan

WHOLE = """\
[study]
title = "Smoking and readmission"
question = "Are smokers readmitted more often?"
design = "cohort"
aim = "association"
not_measured = ["frailty"]

[records]
source = "records.csv"
not_recorded = ["", "NA", 999]
keep = "age >= 18"
count = "n"

[columns.sex]
kind = "category"
levels = ["female", "male"]
reference = "female"
other_levels = "exclude and count"
label = "Sex"
timing = "before exposure"
why = "differs by ward, affects readmission"

[columns."body mass"]
kind = "number"
units = "kg/m²"
per = 5

[columns.age]
per = "SD"

[columns.smoker]
levels = [0, 1.0]
reference = 0

[outcome]
column = "died"
event = 1
label = "Death"

[[models]]
name = "main"
formula = "died ~ smoker + age + sex"
exposures = ["smoker"]
level = 0.9

[[models]]
name = "women"
formula = "smoker + age"
exposures = ["smoker"]
keep = "sex == 'female'"
same_records = false

[report]
audience = "internal"
hide_counts_below = 10

[run]
seed = 7
"""

LEAST = """\
[study]
title = "t"
design = "trial"
[records]
source = "r.csv"
[outcome]
column = "died"
[[models]]
name = "main"
formula = "arm"
exposures = ["arm"]
"""


def written(folder: Path, text: str | bytes) -> Path:
    path = folder / "plan.toml"
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return path


def test_a_whole_plan_is_read_as_it_is_written(tmp_path: Path) -> None:
    file = read_plan(written(tmp_path, WHOLE))
    plan = file.plan
    assert plan.study.title == "Smoking and readmission"
    assert plan.study.not_measured == ("frailty",)
    assert plan.records.not_recorded == ("", "NA", "999")
    assert plan.columns["body mass"].per == 5.0
    assert isinstance(plan.columns["body mass"].per, float)
    assert plan.columns["age"].per == "SD"
    assert plan.columns["smoker"].levels == ("0", "1")
    assert plan.columns["smoker"].reference == "0"
    assert plan.outcome.event == "1"
    assert [model.name for model in plan.models] == ["main", "women"]
    assert plan.models[1].same_records is False
    assert plan.report.hide_counts_below == 10
    assert plan.run.seed == 7
    assert file.text == WHOLE
    assert file.sha256 == hashlib.sha256(WHOLE.encode()).hexdigest()


def test_what_a_plan_leaves_out_has_its_default(tmp_path: Path) -> None:
    plan = read_plan(written(tmp_path, LEAST)).plan
    assert plan.outcome.event is None
    assert plan.models[0].level == 0.95
    assert plan.models[0].same_records is True
    assert plan.report.audience == "shareable"
    assert plan.report.hide_counts_below == 5
    assert plan.columns == {}


def test_a_byte_order_mark_and_windows_line_ends_are_accepted(tmp_path: Path) -> None:
    plan = read_plan(written(tmp_path, b"\xef\xbb\xbf" + LEAST.replace("\n", "\r\n").encode())).plan
    assert plan.study.design == "trial"


@pytest.mark.parametrize("event", [True, 1, 1.0, "1"])
def test_spellings_of_the_event_are_kept_as_texts(event: object) -> None:
    values = {
        "study": {"title": "t", "design": "cohort"},
        "records": {"source": "data frame"},
        "outcome": {"column": "died", "event": event},
        "models": [{"name": "main", "formula": "died ~ smoker", "exposures": ("smoker",)}],
    }
    file = plan_from_values(values)
    assert file.plan.outcome.event == ("true" if event is True else "1")


def test_a_plan_from_values_has_a_text_that_reads_back_to_the_same_plan(tmp_path: Path) -> None:
    values = {
        "study": {"title": 'a "quoted" title', "design": "cohort", "not_measured": []},
        "records": {"source": "data frame"},
        "columns": {"body mass": {"per": 5}, "sex": {"levels": ["f", "m"], "reference": "f"}},
        "outcome": {"column": "died"},
        "models": [{"name": "main", "formula": "died ~ sex", "exposures": ["sex"], "level": 0.9}],
        "report": {"hide_counts_below": 0},
    }
    file = plan_from_values(values)
    assert read_plan(written(tmp_path, file.text)).plan == file.plan


def test_values_at_fault_are_told_as_from_the_call() -> None:
    values = {
        "study": {"title": "t", "design": "cohort"},
        "records": {"source": "data frame"},
        "columns": {3: {"per": 1}, "age": {"per": 0}},
        "outcome": {"column": "died"},
        "models": [{"name": "main", "formula": "died ~ smoker", "exposures": "smoker"}],
    }
    with pytest.raises(InputFault) as caught:
        plan_from_values(values)
    wheres = [fault.where for fault in caught.value.faults]
    assert any(where.startswith("oddsmodel.fit, [columns.3]") for where in wheres)
    assert "oddsmodel.fit, [columns.age] per" in wheres
    assert "oddsmodel.fit, [[models]] number 1 (“main”) exposures" in wheres


def the_fault(path: Path) -> str:
    with pytest.raises(InputFault) as caught:
        read_plan(path)
    assert len(caught.value.faults) == 1
    return str(caught.value)


def test_files_that_are_no_plan(tmp_path: Path) -> None:
    assert "no such file" in the_fault(tmp_path / "nowhere.toml")
    assert "folder, not a plan" in the_fault(tmp_path)
    assert "larger than 1 MB" in the_fault(written(tmp_path, b"#" * 1_000_001))
    assert "UTF-8" in the_fault(written(tmp_path, LEAST.encode("utf-16")))
    assert "line 2 holds a byte" in the_fault(written(tmp_path, b"# a\ntitle = 'caf\xe9'\n"))
    assert "no such file" in the_fault(Path("plan\0.toml"))
    assert "could not be read" in the_fault(tmp_path / ("x" * 300))
    assert "not an ordinary file" in the_fault(Path("/dev/null"))


def test_an_empty_plan_names_what_it_needs(tmp_path: Path) -> None:
    with pytest.raises(InputFault) as caught:
        read_plan(written(tmp_path, ""))
    whats = [fault.what for fault in caught.value.faults]
    assert whats == [
        f"The plan has no {section} section." for section in ("[study]", "[records]", "[outcome]", "[[models]]")
    ]
