"""The whole job on small invented records: what is written, what is refused, what is said where there is no number."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from oddsmodel.errors import InputFault
from oddsmodel.study.run import RunOutcome, run_plan

PLAN = """
[study]
title = "A test"
question = "Is smoking associated with dying?"
design = "{design}"
[records]
source = "records.csv"
not_recorded = ["", "NA"]
[outcome]
column = "died"
event = "yes"
[columns.smoker]
kind = "category"
levels = ["never", "former", "current"]
reference = "never"
[columns.age]
kind = "number"
units = "years"
per = 10
[[models]]
name = "main"
formula = "{formula}"
exposures = ["smoker"]
{more}
"""


def invented(records: int = 600, seed: int = 2) -> pd.DataFrame:
    rng = np.random.default_rng(seed)
    age = rng.integers(30, 90, records)
    smoker = rng.choice(["never", "former", "current"], records, p=[0.5, 0.3, 0.2])
    sex = rng.choice(["female", "male"], records)
    linear = -1.5 + 0.4 * (smoker == "former") + 0.8 * (smoker == "current") + 0.03 * (age - 60)
    died = np.where(rng.random(records) < 1 / (1 + np.exp(-linear)), "yes", "no")
    frame = pd.DataFrame({"died": died, "smoker": smoker, "age": age.astype(object), "sex": sex})
    frame.loc[rng.random(records) < 0.05, "age"] = "NA"
    return frame


def run(
    folder: Path,
    frame: pd.DataFrame,
    formula: str = "died ~ smoker + age + sex",
    design: str = "cohort",
    more: str = "",
) -> tuple[RunOutcome, dict[str, Any]]:
    frame.to_csv(folder / "records.csv", index=False)
    (folder / "plan.toml").write_text(PLAN.format(formula=formula, design=design, more=more), encoding="utf-8")
    outcome = run_plan(folder / "plan.toml")
    return outcome, json.loads((outcome.folder / "results.json").read_text(encoding="utf-8"))


def test_numbers_are_those_of_statsmodels(tmp_path: Path) -> None:
    frame = invented()
    _, results = run(tmp_path, frame)
    model = results["models"][0]
    complete = frame[frame.age != "NA"]
    X = np.column_stack(
        [
            np.ones(len(complete)),
            complete.smoker == "former",
            complete.smoker == "current",
            complete.sex == "male",
            complete.age.astype(float),
        ]
    ).astype(float)
    y = (complete.died == "yes").to_numpy(float)
    reference = sm.Logit(y, X).fit(disp=0, tol=1e-12)
    found = {(one["term"], one["level"]): one for one in model["coefficients"]}
    assert model["records"] == len(complete)
    assert model["events"] == int(y.sum())
    assert model["log_likelihood"] == pytest.approx(reference.llf, abs=1e-9)
    assert model["null_log_likelihood"] == pytest.approx(reference.llnull, abs=1e-6)
    for key, position, per in ((("smoker", "former"), 1, 1), (("smoker", "current"), 2, 1), (("age", None), 4, 10)):
        one = found[key]
        assert one["odds_ratio"] == pytest.approx(np.exp(per * reference.params[position]), rel=1e-8)
        assert one["standard_error"] == pytest.approx(per * reference.bse[position], rel=1e-7)
        limits = np.exp(per * reference.conf_int()[position])
        assert [one["wald"]["lower"], one["wald"]["upper"]] == pytest.approx(limits, rel=1e-7)
        assert one["wald"]["p"] == pytest.approx(reference.pvalues[position], rel=1e-5)
    without = sm.Logit(y, X[:, [0, 3, 4]]).fit(disp=0, tol=1e-12)
    term = next(term for term in model["terms"] if term["term"] == "smoker")
    assert term["df"] == 2
    assert term["likelihood_ratio"] == pytest.approx(2 * (reference.llf - without.llf), abs=1e-8)
    crude = sm.Logit(y, X[:, :3]).fit(disp=0, tol=1e-12)
    assert found[("smoker", "current")]["crude"]["odds_ratio"] == pytest.approx(np.exp(crude.params[2]), rel=1e-8)
    assert found[("smoker", "current")]["crude_all_records"]["records"] == len(frame)


def test_every_record_is_accounted_for(tmp_path: Path) -> None:
    _, results = run(tmp_path, invented())
    left_out = sum(one["records"] for one in results["records"]["excluded"])
    assert results["records"]["read"] == 600
    assert results["models"][0]["records"] + left_out == 600


def test_interactions_are_tested_by_marginality(tmp_path: Path) -> None:
    frame = invented()
    _, results = run(tmp_path, frame, formula="died ~ smoker * sex + age")
    terms = {term["term"]: term for term in results["models"][0]["terms"]}
    complete = frame[frame.age != "NA"]
    former, current = complete.smoker == "former", complete.smoker == "current"
    male, ones, age = complete.sex == "male", np.ones(len(complete)), complete.age.astype(float)
    y = (complete.died == "yes").to_numpy(float)

    def height(*columns: Any) -> float:
        return float(sm.Logit(y, np.column_stack(columns).astype(float)).fit(disp=0, tol=1e-12).llf)

    # the main effect of smoking is tested with the product left out of both models
    expected = 2 * (height(ones, male, age, former, current) - height(ones, male, age))
    assert terms["smoker"]["likelihood_ratio"] == pytest.approx(expected, abs=1e-7)
    product = 2 * (
        height(ones, male, age, former, current, former & male, current & male)
        - height(ones, male, age, former, current)
    )
    assert terms["smoker:sex"]["likelihood_ratio"] == pytest.approx(product, abs=1e-7)
    exposure = [one for one in results["models"][0]["coefficients"] if one["role"] == "exposure"]
    assert all(one["odds_ratio"] is None for one in exposure)


def test_without_an_intercept_levels_are_tested_for_differing(tmp_path: Path) -> None:
    # Every level has an indicator, which hold the constant: taken away with them it would be tested too.
    frame = invented()
    _, results = run(tmp_path, frame, formula="died ~ 0 + smoker + age")
    terms = {term["term"]: term for term in results["models"][0]["terms"]}
    complete = frame[frame.age != "NA"]
    age, ones = complete.age.astype(float), np.ones(len(complete))
    y = (complete.died == "yes").to_numpy(float)
    smoker = [(complete.smoker == level).astype(float) for level in ("never", "former", "current")]

    def height(*columns: Any) -> float:
        return float(sm.Logit(y, np.column_stack(columns).astype(float)).fit(disp=0, tol=1e-12).llf)

    full = height(*smoker, age)
    for name, df, smaller in (
        ("smoker", 2, height(ones, age)),
        ("all exposure columns", 2, height(ones, age)),
        ("age", 1, height(*smoker)),
        ("whole model", 3, height(ones)),
    ):
        assert terms[name]["df"] == df
        assert terms[name]["likelihood_ratio"] == pytest.approx(2 * (full - smaller), abs=1e-7)
    assert results["models"][0]["null_log_likelihood"] == pytest.approx(height(ones), abs=1e-8)


def test_what_is_called_adjusted(tmp_path: Path) -> None:
    outcome, _ = run(tmp_path, invented(), formula="died ~ smoker")
    (model,) = outcome.results.models
    assert "crude_to_adjusted" not in [table.id for table in model.tables]
    assert {mark.series for figure in model.figures for mark in getattr(figure, "marks", ())} == {"crude"}
    words = (outcome.folder / "report.html").read_text(encoding="utf-8")
    assert "Adjusted odds ratio" not in words
    assert "Odds ratios of the exposure, not adjusted" in words


def test_exposures_are_adjusted_for_each_other(tmp_path: Path) -> None:
    plan = PLAN.replace('exposures = ["smoker"]', 'exposures = ["smoker", "sex"]')
    invented().to_csv(tmp_path / "records.csv", index=False)
    (tmp_path / "plan.toml").write_text(plan.format(formula="died ~ smoker + sex", design="cohort", more=""), "utf-8")
    (model,) = run_plan(tmp_path / "plan.toml").results.models
    marks = [mark for figure in model.figures for mark in getattr(figure, "marks", ())]
    assert [mark.series for mark in marks] == ["crude", "adjusted"] * 3
    assert "noncollapsibility" in [one.code for one in model.findings]
    assert "Adjusted for nothing else; the exposures are mutually adjusted" in (
        (tmp_path / "plan-report" / "report.html").read_text(encoding="utf-8")
    )


def test_a_separated_model_has_no_number(tmp_path: Path) -> None:
    frame = invented()
    frame.loc[frame.smoker == "former", "died"] = "no"
    outcome, results = run(tmp_path, frame)
    model = results["models"][0]
    assert outcome.not_estimated
    former = next(one for one in model["coefficients"] if one["level"] == "former")
    assert former["odds_ratio"] is None
    assert former["log_odds_ratio"] is None
    assert former["profile"]["lower"] is None
    assert former["reasons"]["odds_ratio"].startswith("No finite estimate: at or below")
    others = [one for one in model["coefficients"] if one is not former]
    assert all(one["odds_ratio"] is not None for one in others)
    beside = results["models"][1]
    assert (beside["id"], beside["method"], beside["added_by_program"]) == ("model-1-penalised", "penalised", True)
    assert beside["status"] == "converged"
    stop = next(one for one in model["findings"] if one["code"] == "separated")
    assert "former" in stop["message"]
    assert "No finite estimate" in (outcome.folder / "report.html").read_text(encoding="utf-8")


def test_aliased_columns_are_named_with_their_relation(tmp_path: Path) -> None:
    frame = invented()
    frame["ward"] = np.where(frame.sex == "male", "north", "south")
    outcome, results = run(tmp_path, frame, formula="died ~ smoker + sex + ward")
    stop = next(one for one in results["models"][0]["findings"] if one["code"] == "aliased")
    assert outcome.not_estimated
    assert "ward" in stop["message"].lower()
    assert "sex" in stop["message"].lower()


def test_one_outcome_only(tmp_path: Path) -> None:
    outcome, results = run(tmp_path, invented(), more="keep = \"died == 'yes'\"")
    assert outcome.not_estimated
    assert results["models"][0]["findings"][0]["code"] == "one-outcome-only"


def test_models_share_the_records_complete_for_all(tmp_path: Path) -> None:
    more = """
[[models]]
name = "crude"
formula = "died ~ smoker"
exposures = ["smoker"]
[[models]]
name = "own records"
formula = "died ~ smoker + sex"
exposures = ["smoker"]
same_records = false
"""
    _, results = run(tmp_path, invented(), more=more)
    main, crude, own = results["models"]
    assert main["records"] == crude["records"] < own["records"] == 600
    assert any(one["code"] == "records-differ" for one in results.get("findings", own["findings"]))


def test_a_case_control_study_shows_no_risk(tmp_path: Path) -> None:
    outcome, results = run(tmp_path, invented(), design="case-control")
    model = results["models"][0]
    intercept = next(one for one in model["coefficients"] if one["role"] == "intercept")
    assert intercept["odds_ratio"] is None
    assert intercept["reasons"]["odds_ratio"]
    text = (outcome.folder / "report.html").read_text(encoding="utf-8").lower()
    assert "events per 100" not in text
    assert "risk difference" not in text


def test_grouped_records_count_as_many(tmp_path: Path) -> None:
    frame = invented(300).drop(columns="age")
    (tmp_path / "single").mkdir()
    (tmp_path / "grouped").mkdir()
    _, single = run(tmp_path / "single", frame.assign(age=50), formula="died ~ smoker + sex")
    grouped = frame.groupby(["died", "smoker", "sex"], as_index=False).size().rename(columns={"size": "n"})
    grouped.assign(age=50).to_csv(tmp_path / "grouped" / "records.csv", index=False)
    text = PLAN.format(formula="died ~ smoker + sex", design="cohort", more="")
    text = text.replace('source = "records.csv"', 'source = "records.csv"\ncount = "n"')
    (tmp_path / "grouped" / "plan.toml").write_text(text, encoding="utf-8")
    outcome = run_plan(tmp_path / "grouped" / "plan.toml")
    counted = json.loads((outcome.folder / "results.json").read_text(encoding="utf-8"))
    for one, other in zip(single["models"][0]["coefficients"], counted["models"][0]["coefficients"], strict=True):
        assert one["odds_ratio"] == pytest.approx(other["odds_ratio"], rel=1e-9)
        assert one["profile"]["upper"] == pytest.approx(other["profile"]["upper"], rel=1e-8)
    assert counted["records"]["read"] == 300


def test_the_same_input_gives_the_same_bytes(tmp_path: Path) -> None:
    frame = invented()
    for name in ("one", "other"):
        (tmp_path / name).mkdir()
        run(tmp_path / name, frame)
    files = sorted(path.relative_to(tmp_path / "one") for path in (tmp_path / "one").rglob("*") if path.is_file())
    assert len(files) > 5
    for path in files:
        assert (tmp_path / "one" / path).read_bytes() == (tmp_path / "other" / path).read_bytes(), path


def test_hostile_text_in_records_stays_text(tmp_path: Path) -> None:
    frame = invented()
    frame["ward"] = np.where(frame.sex == "male", "=1+1|cmd", "<img src=x onerror=alert(1)>")
    outcome, _ = run(tmp_path, frame, formula="died ~ smoker + ward")
    report = (outcome.folder / "report.html").read_text(encoding="utf-8")
    assert "<img src=x" not in report
    for table in (outcome.folder / "tables").glob("*.csv"):
        for line in table.read_text(encoding="utf-8").splitlines():
            assert not any(cell.strip('"').startswith("=") for cell in line.split(",")), (table, line)


def test_a_folder_that_is_not_ours_is_left_alone(tmp_path: Path) -> None:
    folder = tmp_path / "plan-report"
    folder.mkdir()
    (folder / "thesis.txt").write_text("mine", encoding="utf-8")
    with pytest.raises(InputFault):
        run(tmp_path, invented())
    assert [path.name for path in folder.iterdir()] == ["thesis.txt"]


def test_an_interrupted_run_leaves_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import oddsmodel.report.document as document

    def interrupted(*_: Any, **__: Any) -> str:
        raise KeyboardInterrupt

    monkeypatch.setattr(document, "render_report", interrupted)
    with pytest.raises(KeyboardInterrupt):
        run(tmp_path, invented())
    assert sorted(path.name for path in tmp_path.iterdir()) == ["plan.toml", "records.csv"]


@pytest.mark.parametrize(
    ("formula", "told"),
    [
        ("died ~ smokr + age", "smoker"),
        ("died ~ smoker + __import__('os').system('true')", "formula"),
        ("age ~ smoker", "outcome"),
        ("died ~ age", "exposure"),
    ],
)
def test_faults_of_the_formula_are_told(tmp_path: Path, formula: str, told: str) -> None:
    with pytest.raises(InputFault) as caught:
        run(tmp_path, invented(), formula=formula)
    assert told in str(caught.value)
    assert not (tmp_path / "plan-report").exists()
