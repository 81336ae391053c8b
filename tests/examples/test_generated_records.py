"""The examples' records: made by their scripts to the byte, within size, and carrying the truth the scripts state."""

from __future__ import annotations

import runpy
import tomllib
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.formula.api as smf

from oddsmodel.plan.schema import StudyPlan

EXAMPLES = Path(__file__).parents[2] / "examples"
NAMES = ("readmissions", "workshop-asthma")


@pytest.mark.parametrize("name", NAMES)
def test_script_makes_the_records_to_the_byte(name: str, tmp_path: Path) -> None:
    script = tmp_path / "generate.py"
    script.write_bytes((EXAMPLES / name / "generate.py").read_bytes())
    runpy.run_path(str(script), run_name="__main__")
    made, kept = (tmp_path / "records.csv").read_bytes(), (EXAMPLES / name / "records.csv").read_bytes()
    assert made == kept
    assert len(kept) < 400_000


@pytest.mark.parametrize("name", NAMES)
def test_plan_is_valid_and_names_columns_of_the_records(name: str) -> None:
    table = tomllib.loads((EXAMPLES / name / "plan.toml").read_text(encoding="utf-8"))
    plan = StudyPlan.model_validate(table, strict=False)
    heading = (EXAMPLES / name / "records.csv").read_text(encoding="utf-8").splitlines()[0].split(",")
    assert {*plan.columns, plan.outcome.column} <= set(heading)
    assert len(plan.models) == 2
    assert plan.study.not_measured
    adjustment = set(plan.columns) - {exposure for model in plan.models for exposure in model.exposures}
    for column in adjustment:
        section = plan.columns[column]
        assert section.kind == "identifier" or (section.why and section.timing == "before exposure")


def truth(name: str) -> dict[str, float]:
    return dict(runpy.run_path(str(EXAMPLES / name / "generate.py"))["TRUE_ODDS_RATIOS"])


def coded(name: str, numbers: list[str], not_recorded: dict[str, str]) -> pd.DataFrame:
    """The records complete on every column, read with pandas alone."""
    frame = pd.read_csv(EXAMPLES / name / "records.csv", dtype=str, keep_default_na=False)
    frame = frame.apply(lambda column: column.str.strip()).replace({"": None, "NA": None})
    for column, text in not_recorded.items():
        frame.loc[frame[column] == text, column] = None
    frame = frame.dropna()
    return frame.astype(dict.fromkeys(numbers, float))


def odds_ratio(fit: object, coefficient: str) -> tuple[float, float, float]:
    lower, upper = np.exp(fit.conf_int().loc[coefficient])  # type: ignore[attr-defined]
    return float(np.exp(fit.params[coefficient])), float(lower), float(upper)  # type: ignore[attr-defined]


def test_readmissions_carry_their_truth_and_mislead_unadjusted() -> None:
    # statsmodels Logit on the records as pandas reads them, against the odds ratios that made them
    frame = coded(
        "readmissions",
        ["age", "dependency", "previous_admissions", "length_of_stay"],
        {"age": "999", "ward": "respite"},
    )
    frame = frame[frame["age"] >= 18].assign(event=lambda records: (records["readmitted"] == "yes").astype(int))
    adjusted = smf.logit(
        "event ~ C(follow_up) + I(age / 10) + C(sex) + C(hospital) + C(admission, Treatment('planned'))"
        " + C(ward, Treatment('medical')) + dependency + previous_admissions + np.log2(length_of_stay)"
        " + C(smoking, Treatment('never')) + C(living_alone)",
        frame,
    ).fit(disp=0)
    crude = smf.logit("event ~ C(follow_up)", frame).fit(disp=0)
    true = truth("readmissions")
    estimate, lower, upper = odds_ratio(adjusted, "C(follow_up)[T.not booked]")
    assert lower < true["follow_up: not booked against booked"] < upper
    unadjusted = odds_ratio(crude, "C(follow_up)[T.not booked]")[0]
    assert unadjusted > 1.25 * estimate
    named = {
        "I(age / 10)": "age, per 10 years",
        "C(sex)[T.male]": "sex: male against female",
        "C(admission, Treatment('planned'))[T.emergency]": "admission: emergency against planned",
        "dependency": "dependency, per point",
        "previous_admissions": "previous_admissions, per admission",
        "np.log2(length_of_stay)": "length_of_stay, per doubling",
        "C(smoking, Treatment('never'))[T.current]": "smoking: current against never",
        "C(living_alone)[T.yes]": "living_alone: yes against no",
    }
    for coefficient, name in named.items():
        distance = abs(adjusted.params[coefficient] - np.log(true[name])) / adjusted.bse[coefficient]
        assert distance < 2.6


def test_readmissions_have_the_faults_of_real_records() -> None:
    frame = pd.read_csv(EXAMPLES / "readmissions" / "records.csv", dtype=str, keep_default_na=False)
    assert len(frame) == 4000
    assert frame["record"].is_unique
    assert (frame["age"] == "999").any()
    assert (frame["sex"] == "male ").any()
    assert (frame["smoking"] == "NA").any()
    assert (frame["living_alone"] == "").any()
    assert (frame["readmitted"] == "").any()
    assert 0 < (frame["ward"] == "respite").sum() < 30
    assert 10 < (frame["ward"].str.strip() == "burns").sum() < 50
    stay = pd.to_numeric(frame["length_of_stay"]).dropna()
    assert stay.mean() > 1.3 * stay.median()


def test_workshop_asthma_carries_its_truth_and_misleads_unadjusted() -> None:
    frame = coded("workshop-asthma", ["people"], {})
    frame = frame.loc[frame.index.repeat(frame["people"].astype(int))]
    frame = frame.assign(event=(frame["status"] == "case").astype(int))
    dust = "C(dust, Treatment('none'))"
    adjusted = smf.logit(
        f"event ~ {dust} + C(age_band, Treatment('under 35')) + C(smoking, Treatment('never'))", frame
    ).fit(disp=0)
    crude = smf.logit(f"event ~ {dust}", frame).fit(disp=0)
    true = truth("workshop-asthma")
    for level in ("some", "heavy"):
        _, lower, upper = odds_ratio(adjusted, f"{dust}[T.{level}]")
        assert lower < true[f"dust: {level} against none"] < upper
    heavy = f"{dust}[T.heavy]"
    assert odds_ratio(crude, heavy)[0] > 1.4 * odds_ratio(adjusted, heavy)[0]
