"""What a file holds, for a starter plan."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd

from oddsmodel.records.survey import ColumnSurvey, RecordsSurvey, survey


def surveyed(tmp_path: Path) -> tuple[RecordsSurvey, dict[str, ColumnSurvey]]:
    n = 120
    rng = np.random.default_rng(3)
    row = np.arange(n)
    frame = pd.DataFrame(
        {
            "patient_id": 1000 + rng.permutation(n),
            "code": [f"p{number}" for number in range(n)],
            "died": np.where(row % 7 == 0, "Yes", "no"),
            "age": np.where(row % 20 == 0, 999, 30 + row % 50),
            "weight": np.where(row % 15 == 0, "NA", (60 + row / 7).round(1).astype(str)),
            "grade": 1 + row % 3,
            "ward": np.where(row % 9 == 0, "unknown", np.where(row % 2 == 0, "North", "north")),
            "seen": [f"2020-01-{1 + number % 28:02d}" for number in range(n)],
            "stray": [*("old" for _ in range(3)), *(str(number) for number in range(3, n))],
            "street": [f"street {number % 40}" for number in range(n)],
            "spare": [""] * n,
        }
    )
    frame.to_csv(tmp_path / "people.csv", index=False)
    found = survey(tmp_path / "people.csv")
    return found, {column.name: column for column in found.columns}


def test_kinds(tmp_path: Path) -> None:
    found, columns = surveyed(tmp_path)
    assert (found.source, found.records, len(found.sha256)) == ("people.csv", 120, 64)
    assert {name: column.kind for name, column in columns.items()} == {
        "patient_id": "identifier",
        "code": "identifier",
        "died": "yes-no",
        "age": "number",
        "weight": "number",
        "grade": "number",
        "ward": "category",
        "seen": "date",
        "stray": "number",
        "street": "category",
        "spare": "category",
    }


def test_numbers(tmp_path: Path) -> None:
    _, columns = surveyed(tmp_path)
    age, weight, grade = columns["age"], columns["weight"], columns["grade"]
    assert (age.lower, age.upper, age.suspected, age.different) == (30, 79, ("999",), 50)
    assert (weight.suspected, weight.not_recorded, weight.levels) == (("NA",), 8, ())
    assert grade.levels == (("1", 40), ("2", 40), ("3", 40))
    assert any("a set of categories" in question for question in grade.questions)
    assert any("texts among the numbers" in question for question in columns["stray"].questions)
    assert columns["stray"].not_recorded == 0


def test_levels(tmp_path: Path) -> None:
    _, columns = surveyed(tmp_path)
    ward = columns["ward"]
    assert ward.suspected == ("unknown",)
    assert ward.not_recorded == 14
    assert [level for level, _ in ward.levels] == ["North", "north"]
    assert sum(count for _, count in ward.levels) == 106
    assert any("“North” and “north”" in question for question in ward.questions)
    assert columns["died"].levels == (("no", 102), ("yes", 18))
    assert (columns["street"].different, len(columns["street"].levels)) == (40, 30)
    assert any("40 levels" in question for question in columns["street"].questions)
    assert columns["spare"].questions == ("No value is recorded: leave the column out.",)


def test_identifiers_show_none_of_their_values(tmp_path: Path) -> None:
    _, columns = surveyed(tmp_path)
    for name in ("patient_id", "code"):
        assert columns[name].levels == ()
        assert columns[name].different == 120
        assert any("identifier" in question for question in columns[name].questions)
