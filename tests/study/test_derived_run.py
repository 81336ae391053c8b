"""An untidy extract from file to report: codes, spaces, odd names, dates and derived columns, and a second quarter."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from oddsmodel.errors import InputFault
from oddsmodel.export.results_json import results_schema
from oddsmodel.study.run import run_plan

PLAN = """
[study]
title = "Wards and dying"
design = "cohort"
[records]
source = "first-quarter.csv"
not_recorded = ["", "9", "99"]
keep = "age >= 18"
[outcome]
column = "died"
event = "yes"
[columns.diabetes]
kind = "yes-no"
[columns.cancer]
kind = "yes-no"
[columns.parity]
from = "Parity (n)"
plausible = [0, 20]
[columns.bmi]
from = "BMI at entry"
plausible = [10, 80]
[derived.age]
years_between = ["born", "admitted"]
label = "Age at admission"
units = "years"
per = 10
timing = "before exposure"
[derived.bmi_band]
bands_of = "bmi"
edges = [18.5, 25, 30]
reference = "18.5 to under 25"
label = "BMI band"
[derived.illness]
points = {diabetes = 1, cancer = 2}
label = "Illness score"
[derived.age_third]
quantile_groups_of = "age"
groups = 3
[derived.side]
groups_of = "ward"
groups = {surgical = ["S1", "S2"], medical = ["M1"]}
reference = "medical"
label = "Side of the house"
{more}
[[models]]
name = "main"
formula = "died ~ side + age + bmi_band + illness + parity"
exposures = ["side"]
[report]
audience = "{audience}"
"""


def untidy(wards: list[str], seed: int, records: int = 900) -> tuple[str, pd.DataFrame]:
    """A file's text with a byte-order mark, and the same records as they are meant."""
    rng = np.random.default_rng(seed)
    admitted = pd.Timestamp("2024-01-01") + pd.to_timedelta(rng.integers(0, 91, records), unit="D")
    born = admitted - pd.to_timedelta(rng.integers(16 * 365, 98 * 365, records), unit="D")
    meant = pd.DataFrame(
        {
            "age": (admitted - born).days / 365.25,
            "bmi": np.round(rng.normal(27, 5, records), 1),
            "parity": rng.integers(0, 6, records),
            "ward": rng.choice(wards, records),
            "diabetes": rng.random(records) < 0.2,
            "cancer": rng.random(records) < 0.1,
        }
    )
    linear = -1.6 + 0.03 * (meant.age - 60) + 0.5 * (meant.ward != "M1") + 0.4 * meant.diabetes + 0.8 * meant.cancer
    meant["died"] = rng.random(records) < 1 / (1 + np.exp(-linear))
    missing = {name: rng.random(records) < 0.03 for name in ("bmi", "parity", "diabetes", "born")}
    yes = {True: "yes", False: "no"}
    written = pd.DataFrame(
        {
            "died": meant.died.map(yes),
            "born": pd.Series(born.strftime("%d/%m/%Y")).mask(missing["born"], ""),
            "admitted": admitted.strftime("%Y-%m-%d"),
            "BMI at entry": meant.bmi.astype(str).mask(missing["bmi"], "999"),
            "Parity (n)": meant.parity.astype(str).mask(missing["parity"], "88"),
            "ward": meant.ward.where(rng.random(records) < 0.7, meant.ward + "  "),
            "diabetes": meant.diabetes.map(yes).mask(missing["diabetes"], "9"),
            "cancer": meant.cancer.map(yes),
        }
    )
    known = ~np.any(list(missing.values()), axis=0)
    return "\ufeff" + written.to_csv(index=False), meant[known & (meant.age >= 18)]


def run(folder: Path, *, more: str = "", audience: str = "shareable", second: bool = False) -> dict[str, Any]:
    first, _ = untidy(["S1", "S2", "M1"], 1)
    later, _ = untidy(["S1", "S2", "M1", "S4"], 2)
    (folder / "first-quarter.csv").write_text(first, encoding="utf-8")
    (folder / "second-quarter.csv").write_text(later, encoding="utf-8")
    text = PLAN.replace("{more}", more).replace("{audience}", audience)
    (folder / "plan.toml").write_text(text, encoding="utf-8")
    outcome = run_plan(folder / "plan.toml", records=folder / "second-quarter.csv" if second else None)
    (path,) = [one for one in outcome.files if one.suffix == ".json"]
    results: dict[str, Any] = json.loads(path.read_text(encoding="utf-8"))
    jsonschema.validate(results, results_schema())
    return results


def table(results: dict[str, Any], name: str) -> list[dict[str, Any]]:
    (column,) = [one for one in results["derived"] if one["name"] == name]
    (found,) = column["tables"]
    return [dict(zip([head["key"] for head in found["columns"]], row, strict=True)) for row in found["rows"]]


def test_estimates_are_those_of_statsmodels_on_the_records_as_meant(tmp_path: Path) -> None:
    results = run(tmp_path)
    _, meant = untidy(["S1", "S2", "M1"], 1)
    band = pd.cut(meant.bmi, [-np.inf, 18.5, 25, 30, np.inf], right=False, labels=False)
    X = np.column_stack(
        [
            np.ones(len(meant)),
            meant.ward.isin(["S1", "S2"]),
            meant.age / 10,
            *(band == code for code in (0, 2, 3)),
            meant.diabetes + 2 * meant.cancer,
            meant.parity,
        ]
    ).astype(float)
    wanted = np.exp(sm.Logit(meant.died.astype(float), X).fit(disp=0, tol=1e-12).params)
    model = results["models"][0]
    assert model["records"] == len(meant)
    found = {(one["term"], one["level"]): one["odds_ratio"] for one in model["coefficients"]}
    names = [("side", "surgical"), ("age", None), ("bmi_band", "under 18.5"), ("bmi_band", "25 to under 30")]
    names += [("bmi_band", "30 or over"), ("illness", None), ("parity", None)]
    np.testing.assert_allclose([found[name] for name in names], wanted[1:], rtol=1e-7)


def test_cross_counts_cut_points_and_notes(tmp_path: Path) -> None:
    results = run(tmp_path, audience="internal")
    text, meant = untidy(["S1", "S2", "M1"], 1)
    assert text.startswith("\ufeff")
    assert [(row["source"], row["records"]) for row in table(results, "side")] == [
        (ward, int((meant.ward == ward).sum())) for ward in ("S1", "S2", "M1")
    ]
    (highest,) = [row for row in table(results, "bmi_band") if row["label"] == "BMI band: 30 or over"]
    assert highest["records"] == (meant.bmi >= 30).sum()
    assert highest["largest"] == meant.bmi.max()
    rows = table(results, "illness")
    assert [row["records"] for row in rows] == [
        int((meant.diabetes + 2 * meant.cancer == score).sum()) for score in range(4)
    ]
    assert sum(row["cancer_yes"] for row in rows) == meant.cancer.sum()
    # The cut points rest on every record kept with both dates, complete or not; numpy gives the quantiles.
    ages = _ages(text)
    cuts = next(one for one in results["derived"] if one["name"] == "age_third")["cut_points"]
    np.testing.assert_allclose(cuts, np.quantile(ages[ages >= 18], [1 / 3, 2 / 3]), atol=0.05)
    messages = {one["code"]: one["message"] for one in results["findings"]}
    assert "“BMI at entry” in the file is “bmi”" in messages["columns-renamed"]
    assert "“age” was cut at" in messages["quantile-cuts"]
    told = [one["message"] for one in results["findings"] if one["code"] == "implausible-values"]
    assert len(told) == 2
    assert results["plan"]["columns"]["bmi"]["from"] == "BMI at entry"


def _ages(text: str) -> np.ndarray[Any, np.dtype[np.float64]]:
    from io import StringIO

    frame = pd.read_csv(StringIO(text.removeprefix("\ufeff")))
    years = (pd.to_datetime(frame.admitted) - pd.to_datetime(frame.born, format="%d/%m/%Y")).dt.days / 365.25
    return years.dropna().to_numpy(dtype=np.float64)


def test_a_shareable_report_shows_them_folded_and_coarse(tmp_path: Path) -> None:
    results = run(tmp_path)
    _, meant = untidy(["S1", "S2", "M1"], 1)
    rows = table(results, "bmi_band")
    assert {row["smallest"] for row in rows if row["smallest"] is not None} <= set(np.arange(0.0, 60.0, 2.0))
    assert rows[-1]["largest"] > meant.bmi.max()
    for name in ("side", "illness", "bmi_band", "age_third", "age"):
        for row in table(results, name):
            assert row["records"] is None or row["records"] == 0 or row["records"] >= 5
    page = (tmp_path / "plan-report" / "report.html").read_text(encoding="utf-8")
    assert "Side of the house, counted beside what it was made from" in page
    assert "<details><summary>How Age at admission, BMI band, Illness score, age_third and Side" in page
    assert (tmp_path / "plan-report" / "tables" / "derived.csv").read_text(encoding="utf-8").startswith('"label",')


def test_a_ward_that_appears_in_the_second_quarter_stops_the_run(tmp_path: Path) -> None:
    with pytest.raises(InputFault) as caught:
        run(tmp_path, second=True)
    told = str(caught.value)
    assert told.startswith("the plan, [derived.side] groups: No group has “S4” (")
    assert '"exclude and count"' in told
    assert not (tmp_path / "plan-report").exists()


def test_or_is_left_out_and_counted(tmp_path: Path) -> None:
    results = run(tmp_path, more='other_levels = "exclude and count"', second=True)
    _, meant = untidy(["S1", "S2", "M1", "S4"], 2)
    assert results["models"][0]["records"] == (meant.ward != "S4").sum()
    left_out = {one["code"]: one["records"] for one in results["models"][0]["left_out"]}
    assert left_out["level-not-in-plan"] == (meant.ward == "S4").sum()


def test_derived_outcomes_and_conditions(tmp_path: Path) -> None:
    first, meant = untidy(["S1", "S2", "M1"], 1)
    (tmp_path / "first-quarter.csv").write_text(first, encoding="utf-8")
    text = PLAN.replace("{more}", "").replace("{audience}", "internal")
    text = text.replace('column = "died"', 'column = "lost"').replace("died ~", "lost ~")
    text += '[derived.lost]\ngroups_of = "died"\ngroups = {yes = ["yes"], no = ["no"]}\n'
    text = text.replace(
        'keep = "age >= 18"', """keep = "age >= 18 and (side == 'surgical' or bmi_band > '25 to under 30')" """
    )
    (tmp_path / "plan.toml").write_text(text, encoding="utf-8")
    outcome = run_plan(tmp_path / "plan.toml")
    kept = meant[(meant.ward != "M1") | (meant.bmi >= 30)]
    assert outcome.results.models[0].records == len(kept)
    assert outcome.results.models[0].events == kept.died.sum()
