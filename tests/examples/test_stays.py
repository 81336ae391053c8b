"""The untidy register of stays: made by its script to the byte, analysed by its plans, true to what it states."""

from __future__ import annotations

import json
import runpy
from pathlib import Path
from typing import Any

import pandas as pd
import pytest

from oddsmodel.study.run import run_plan

STAYS = Path(__file__).parents[2] / "examples" / "stays"


def results(name: str, folder: Path) -> dict[str, Any]:
    done = run_plan(STAYS / f"{name}.toml", into=folder / "report")
    found: dict[str, Any] = json.loads((done.folder / "results.json").read_text(encoding="utf-8"))
    return found


def records() -> pd.DataFrame:
    """The register read with pandas alone."""
    frame = pd.read_csv(STAYS / "records.csv", sep=";", dtype=str, encoding="utf-8-sig", keep_default_na=False)
    frame = frame.apply(lambda column: column.str.strip())
    day_first = {name: pd.to_datetime(frame[name], format="%d.%m.%Y") for name in ("admitted", "last seen")}
    return frame.assign(**day_first, **{"died on": pd.to_datetime(frame["died on"].replace("", None))})


def test_script_makes_the_records_to_the_byte(tmp_path: Path) -> None:
    script = tmp_path / "generate.py"
    script.write_bytes((STAYS / "generate.py").read_bytes())
    runpy.run_path(str(script), run_name="__main__")
    assert (tmp_path / "records.csv").read_bytes() == (STAYS / "records.csv").read_bytes()


def test_death_within_a_year_of_the_first_stay(tmp_path: Path) -> None:
    found = results("within_a_year", tmp_path)
    frame = records()
    frame = frame[(frame.age != "999") & (frame.age != "")].sort_values("admitted", kind="stable")
    firsts = frame.drop_duplicates("patient")
    year, extracted = pd.Timedelta(days=365), pd.Timestamp("2025-03-31")
    late = firsts.admitted + year > extracted
    died = firsts["died on"] < firsts.admitted + year
    lost = ~died & (firsts["last seen"] < firsts.admitted + year)
    unknown = firsts.smoker == ""
    counted = {one["code"]: one["records"] for one in found["records"]["excluded"]}
    assert counted["repeat"] == len(frame) - len(firsts)
    assert counted["window-not-finished"] == late.sum()
    assert counted["outcome-not-recorded"] == (~late & lost).sum()
    assert counted["exposure-not-recorded"] == (~late & ~lost & unknown).sum()
    model = found["models"][0]
    assert model["events"] == (died & ~late & ~lost & ~unknown).sum()
    smoker = next(one for one in model["coefficients"] if one["term"] == "smoker")
    truth = runpy.run_path(str(STAYS / "generate.py"))["TRUE_ODDS_RATIOS"]["smoker"]
    assert smoker["profile"]["lower"] < truth < smoker["profile"]["upper"]


def test_a_bad_end_of_the_last_stay(tmp_path: Path) -> None:
    found = results("bad_end", tmp_path)
    lasts = records().sort_values("admitted", kind="stable").drop_duplicates("patient", keep="last")
    bad = (lasts.infection == "yes") | lasts["died on"].notna()
    known = bad | (lasts.infection == "no")
    complete = known & (lasts.smoker != "") & ~lasts.age.isin(["", "999"])
    model = found["models"][0]
    assert (model["records"], model["events"]) == (complete.sum(), (complete & bad).sum())


@pytest.mark.parametrize("name", ["within_a_year", "bad_end"])
def test_the_report_tells_the_rules(name: str, tmp_path: Path) -> None:
    found = results(name, tmp_path)
    assert len(found["study"]["rules"]) == 2
    report = (tmp_path / "report" / "report.html").read_text(encoding="utf-8")
    assert "Of several records of the same “patient” that belong to the study" in report
