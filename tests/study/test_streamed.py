"""A study whose records stay on disk gives the results that it gives in memory: to the last bit where nothing is
rounded."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest

from oddsmodel.model import rows
from oddsmodel.study import check, room
from oddsmodel.study.run import run_plan

PLAN = """
[study]
title = "Streamed"
question = "Is the exposure associated with the outcome?"
design = "{design}"
[records]
source = "{source}"
not_recorded = ["", "NA"]
keep = "age >= 20"
{records}
[outcome]
column = "outcome"
event = "yes"
[columns.exposure]
kind = "category"
levels = ["none", "some", "much"]
reference = "none"
[columns.region]
kind = "category"
[columns.age]
kind = "number"
per = 10
plausible = [0, 100]
[columns.weight]
kind = "number"
per = "SD"
[derived.age_band]
bands_of = "age"
edges = [40, 60]
[[models]]
name = "main"
formula = "outcome ~ {formula}"
exposures = ["exposure"]
[[models]]
name = "with bands"
formula = "outcome ~ exposure + age_band + region"
exposures = ["exposure"]
role = "sensitivity"
[[models]]
name = "the young"
based_on = "main"
keep = "age < 50"
role = "subgroup"
[run]
memory = "1 GB"
"""


def frame(n: int) -> pd.DataFrame:
    rng = np.random.default_rng(n)
    made = pd.DataFrame(
        {
            "exposure": rng.choice(["none", "some", "much"], n, p=[0.5, 0.3, 0.2]),
            "region": rng.choice(["north", "east", "south", "west"], n),
            "age": rng.integers(15, 90, n).astype(float),
            "weight": np.round(rng.normal(75, 14, n), 1),
            "n": rng.integers(0, 4, n),
        }
    )
    linear = -2.0 + 0.4 * (made.exposure == "some") + 0.8 * (made.exposure == "much") + 0.03 * (made.age - 50)
    made["outcome"] = np.where(rng.random(n) < 1 / (1 + np.exp(-linear)), "yes", "no")
    for name in ("exposure", "age", "outcome", "region"):
        made.loc[rng.random(n) < 0.02, name] = None
    made.loc[rng.random(n) < 0.01, "age"] = 150.0
    return made


def written(folder: Path, n: int, *, parquet: bool = False, **how: str) -> Path:
    source = "records.parquet" if parquet else "records.csv"
    made = frame(n)
    if parquet:
        made.to_parquet(folder / source, index=False)
    else:
        made.to_csv(folder / source, index=False)
    facts = {"design": "cohort", "formula": "exposure + rcs(age, 4) + weight + region", "records": "", **how}
    (folder / "plan.toml").write_text(PLAN.format(source=source, **facts), encoding="utf-8")
    return folder / "plan.toml"


def results(plan: Path, into: Path, monkeypatch: pytest.MonkeyPatch, *, on_disk: bool) -> dict[str, Any]:
    monkeypatch.setattr(check, "wanted", lambda path: 10**15 if on_disk else 0)
    run_plan(plan, into=into)
    return json.loads((into / "results.json").read_text(encoding="utf-8"))


@pytest.mark.parametrize(
    "how",
    [
        {},
        {"parquet": True, "design": "case-control"},
        {"records": 'count = "n"'},
        {"formula": "exposure*region + age + center(weight)"},
        {"formula": "exposure + region"},
    ],
    ids=["csv", "parquet", "counts", "product", "levels"],
)
def test_on_disk_as_in_memory(how: dict[str, Any], tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    plan = written(tmp_path, 6_000, **how)
    in_memory = results(plan, tmp_path / "memory", monkeypatch, on_disk=False)
    on_disk = results(plan, tmp_path / "disk", monkeypatch, on_disk=True)
    assert in_memory["models"][0]["coefficients"]
    assert on_disk == in_memory
    assert (tmp_path / "disk/report.html").read_bytes() == (tmp_path / "memory/report.html").read_bytes()


def test_single_records_on_disk_as_in_memory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """As with more covariate patterns than are held: the rows are the records, read again in every pass."""
    monkeypatch.setattr(rows, "MOST_PATTERNS", 500)
    plan = written(tmp_path, 150_000, parquet=True)
    in_memory = results(plan, tmp_path / "memory", monkeypatch, on_disk=False)
    on_disk = results(plan, tmp_path / "disk", monkeypatch, on_disk=True)
    assert in_memory["models"][0]["patterns"] > 120_000
    assert on_disk == in_memory


def test_scratch_files_are_gone(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    scratch = tmp_path / "scratch"
    scratch.mkdir()
    monkeypatch.setattr("tempfile.tempdir", str(scratch))
    results(written(tmp_path, 3_000), tmp_path / "disk", monkeypatch, on_disk=True)
    assert list(scratch.iterdir()) == []


def test_what_is_wanted_grows_with_the_file(tmp_path: Path) -> None:
    small, large = tmp_path / "small", tmp_path / "large"
    small.mkdir()
    large.mkdir()
    for parquet in (False, True):
        name = "records.parquet" if parquet else "records.csv"
        written(small, 1_000, parquet=parquet)
        written(large, 50_000, parquet=parquet)
        few, many = room.wanted(small / name), room.wanted(large / name)
        assert few is not None
        assert many is not None
        assert 40 < (many - room.PROGRAM) / (few - room.PROGRAM) < 60
    assert room.wanted(tmp_path / "nowhere.csv") is None


def test_groups_need_the_records_in_memory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from oddsmodel.errors import InputFault

    plan = written(tmp_path, 500, records='grouped_by = "n"')
    with pytest.raises(InputFault, match="memory"):
        results(plan, tmp_path / "disk", monkeypatch, on_disk=True)
    assert not (tmp_path / "disk").exists()
