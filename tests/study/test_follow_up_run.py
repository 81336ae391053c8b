"""From dates and repeated stays to the report: accounting, losses, methods, disclosure."""

from __future__ import annotations

import html
import json
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from oddsmodel.export.results_json import results_schema
from oddsmodel.study.run import RunOutcome, run_plan

PLAN = """
[study]
title = "Smoking and dying within a year"
question = "Do smokers die more often within a year of a stay?"
design = "cohort"
[records]
source = "stays.csv"
keep = "age >= 18"
repeats = {{of = "patient", use = "first", ordered_by = "admitted"}}
[outcome]
name = "died"
label = "Death within a year"
start = "admitted"
event_date = "died_on"
followed_to = "last_seen"
within_days = 365
extracted = 2025-03-31
{outcome}
[columns.patient]
label = "Patient"
[columns.age]
per = 10
units = "years"
[[models]]
name = "main"
formula = "died ~ smoker + age"
exposures = ["smoker"]
[report]
{report}
"""
EXTRACTED = np.datetime64("2025-03-31")


def stays(losses: float, records: int = 2000, seed: int = 4) -> pd.DataFrame:
    """Invented stays, some of the same patients, with days as dates; `losses` is the rate of loss a day."""
    rng = np.random.default_rng(seed)
    start = np.datetime64("2022-01-01") + rng.integers(0, 1150, records)
    smoker, age = rng.choice(["no", "yes"], records), rng.integers(10, 90, records)
    rate = np.where(smoker == "yes", 1 / 900, 1 / 1800)
    event = start + np.floor(rng.exponential(1 / rate)).astype(int)
    gone = start + np.floor(rng.exponential(1 / losses, records)).astype(int)
    seen = np.minimum(np.minimum(gone, EXTRACTED), event)
    # the register writes the day first, with points, and leaves spaces behind
    written = pd.Series(pd.to_datetime(event)).dt.strftime("%d.%m.%Y ").where(event <= seen, "")
    frame = pd.DataFrame(
        {
            "patient": rng.integers(1, 1600, records),
            "admitted": np.datetime_as_string(start),
            "died_on": written,
            "last_seen": np.datetime_as_string(np.maximum(seen, start)),
            "smoker": np.where(rng.random(records) < 0.03, "", smoker),
            "age": age,
        }
    )
    frame = frame.drop_duplicates(["patient", "admitted"])
    return pd.concat([frame, frame.iloc[:5]], ignore_index=True)  # duplicated rows


def run(
    folder: Path, frame: pd.DataFrame, outcome: str = "", report: str = 'audience = "internal"'
) -> tuple[RunOutcome, dict[str, Any], str]:
    frame.to_csv(folder / "stays.csv", index=False, encoding="utf-8-sig")
    (folder / "plan.toml").write_text(PLAN.format(outcome=outcome, report=report), encoding="utf-8")
    done = run_plan(folder / "plan.toml")
    (results,) = [path for path in done.files if path.suffix == ".json" and "results" in path.name]
    (page,) = [path for path in done.files if path.suffix == ".html"]
    document = json.loads(results.read_text(encoding="utf-8"))
    jsonschema.validate(document, results_schema())
    return done, document, html.unescape(page.read_text(encoding="utf-8"))


def by_hand(frame: pd.DataFrame, from_day: int = 0) -> tuple[pd.DataFrame, dict[str, int]]:
    """The analysed records and the accounting, record by record in pandas."""
    data = frame.assign(
        start=pd.to_datetime(frame.admitted),
        event=pd.to_datetime(frame.died_on.str.strip(), format="%d.%m.%Y", errors="coerce"),
        seen=pd.to_datetime(frame.last_seen),
    )
    counted: dict[str, int] = {}

    def leave_out(code: str, rows: pd.Series) -> None:
        nonlocal data
        counted[code] = int(rows.sum())
        data = data[~rows]

    opens = pd.Timedelta(days=from_day)
    ends = opens + pd.Timedelta(days=365)
    leave_out("not-kept", data.age < 18)
    data = data.sort_values("admitted", kind="stable")
    leave_out("repeat", data.duplicated("patient"))
    leave_out("window-not-finished", data.start + ends > pd.Timestamp("2025-03-31"))
    leave_out("event-before-window", data.event < data.start + opens)
    happened = data.event < data.start + ends
    leave_out("not-observed-to-window", ~happened & (data.seen < data.start + opens) & (from_day > 0))
    happened = data.event < data.start + ends
    leave_out("outcome-not-recorded", ~happened & (data.seen < data.start + ends))
    leave_out("exposure-not-recorded", data.smoker == "")
    return data.assign(died=data.event < data.start + ends), {code: n for code, n in counted.items() if n}


@pytest.mark.parametrize("from_day", [0, 30])
def test_the_numbers_are_those_made_by_hand(tmp_path: Path, from_day: int) -> None:
    frame = stays(losses=1 / 4000)
    _, results, page = run(tmp_path, frame, outcome=f"from_day = {from_day}")
    data, counted = by_hand(frame, from_day)
    model = results["models"][0]
    assert {one["code"]: one["records"] for one in results["records"]["excluded"]} == counted
    assert (model["records"], model["events"]) == (len(data), int(data.died.sum()))
    X = np.column_stack([np.ones(len(data)), data.smoker == "yes", data.age]).astype(float)
    reference = sm.Logit(data.died.to_numpy(float), X).fit(disp=0, tol=1e-12)
    smoker = next(one for one in model["coefficients"] if one["term"] == "smoker")
    assert smoker["odds_ratio"] == pytest.approx(np.exp(reference.params[1]), rel=1e-8)
    assert results["study"]["outcome"] == "died"
    first, second = results["study"]["rules"]
    assert "the first by “admitted” was used" in first
    assert ("of day 30 after “admitted”" in second) is (from_day == 30)
    for said in (first, second, "Window not finished by extraction (2025-03-31)", "Later record of the same Patient"):
        assert said in page


def test_many_lost_are_counted_by_exposure_and_told(tmp_path: Path) -> None:
    frame = stays(losses=1 / 1500)
    done, results, page = run(tmp_path, frame)
    _, counted = by_hand(frame)
    table = next(table for table in done.results.models[0].tables if table.id == "lost")
    assert sum(row[2] for row in table.rows) == counted["outcome-not-recorded"]  # type: ignore[misc]
    finding = next(one for one in results["models"][0]["findings"] if one["code"] == "many-lost")
    assert finding["facts"]["lost_records"] == counted["outcome-not-recorded"]
    assert "time-to-event" in page
    assert "Lost to follow-up, by exposure" in page
    # Those not lost are the ones analysed, level by level.
    levels = next(table for table in done.results.models[0].tables if table.id == "levels")
    assert [row[1] - row[2] for row in table.rows[:2]] == [row[1] for row in levels.rows]  # type: ignore[operator]


def test_few_lost_are_counted_and_not_complained_of(tmp_path: Path) -> None:
    done, results, _ = run(tmp_path, stays(losses=1 / 40_000))
    assert any(table.id == "lost" for table in done.results.models[0].tables)
    assert not any(one["code"] == "many-lost" for one in results["models"][0]["findings"])


def test_small_losses_are_hidden_with_what_gives_them_away(tmp_path: Path) -> None:
    """A level with few lost: the share, the level's records (which with those analysed give the lost) and a second."""
    frame = stays(losses=1 / 40_000)
    inside, _, _ = run(tmp_path, frame)
    whole = next(table for table in inside.results.models[0].tables if table.id == "lost")
    small = [r for r, row in enumerate(whole.rows) if 0 < row[2] < 10]  # type: ignore[operator]
    assert small
    (tmp_path / "out").mkdir()
    outside, _, _ = run(tmp_path / "out", frame, report="hide_counts_below = 10")
    shown = next(table for table in outside.results.models[0].tables if table.id == "lost")
    for r in small:
        assert not isinstance(shown.rows[r][2], int)
        assert not isinstance(shown.rows[r][3], float)
        # With those analysed at the level shown, its records would give the lost away.
        levels = next(table for table in outside.results.models[0].tables if table.id == "levels")
        analysed = levels.rows[r][1] if r < len(levels.rows) else None
        assert not (isinstance(shown.rows[r][1], int) and isinstance(analysed, int))
    hidden = [row for row in shown.rows if not isinstance(row[2], int)]
    assert len(hidden) >= 2 or whole.rows[small[0]][2] not in [row[2] for row in shown.rows]


def test_an_outcome_from_a_condition(tmp_path: Path) -> None:
    rng = np.random.default_rng(8)
    frame = pd.DataFrame(
        {
            "died": rng.choice(["yes", "no", ""], 500, p=[0.2, 0.7, 0.1]),
            "readmitted": rng.choice(["yes", "no", ""], 500, p=[0.2, 0.7, 0.1]),
            "smoker": rng.choice(["yes", "no"], 500),
        }
    )
    frame.to_csv(tmp_path / "stays.csv", index=False)
    (tmp_path / "plan.toml").write_text(
        """
[study]
title = "t"
design = "cohort"
[records]
source = "stays.csv"
[outcome]
name = "bad_end"
event_when = "died == 'yes' or readmitted == 'yes'"
[[models]]
name = "main"
formula = "bad_end ~ smoker"
exposures = ["smoker"]
""",
        encoding="utf-8",
    )
    done = run_plan(tmp_path / "plan.toml")
    results = json.loads((done.folder / "results.json").read_text(encoding="utf-8"))
    event = (frame.died == "yes") | (frame.readmitted == "yes")
    known = event | ((frame.died == "no") & (frame.readmitted == "no"))
    assert (results["models"][0]["records"], results["models"][0]["events"]) == (int(known.sum()), int(event.sum()))
    (rule,) = results["study"]["rules"]
    assert "decided by the other parts" in rule
    report = (done.folder / "report.html").read_text(encoding="utf-8")
    assert "died == &#39;yes&#39; or readmitted == &#39;yes&#39;" in report
    assert "Where a part of this was not recorded" in report
