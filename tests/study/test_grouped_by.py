"""Records of the same patients: cluster-robust intervals lead, and nothing is given that rests on independence."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy import stats

from oddsmodel.errors import InputFault
from oddsmodel.export.results_json import results_schema
from oddsmodel.study.run import run_plan

PLAN = """
[study]
title = "Repeated stays"
design = "cohort"
[records]
source = "records.csv"
not_recorded = ["", "NA"]
grouped_by = "patient"
{records}
[columns.patient]
label = "Patient"
{patient}
[columns.smoker]
kind = "category"
levels = ["never", "former", "current"]
[columns.age]
kind = "number"
per = 10
[outcome]
column = "died"
event = "yes"
[[models]]
name = "main"
formula = "{formula}"
exposures = ["smoker"]
[report]
audience = "{audience}"
"""


def invented(groups: int = 120, seed: int = 3) -> pd.DataFrame:
    rng = np.random.default_rng(seed)
    patient = np.repeat(np.arange(groups), rng.integers(1, 10, groups))
    n = patient.size
    smoker = rng.choice(["never", "former", "current"], groups, p=[0.5, 0.3, 0.2])[patient]
    age = rng.integers(30, 90, groups)[patient] + rng.integers(0, 3, n)
    sex = rng.choice(["female", "male"], groups)[patient]
    linear = -0.6 + 0.7 * (smoker == "current") + 0.02 * (age - 60) + rng.normal(0, 0.8, groups)[patient]
    died = np.where(rng.random(n) < 1 / (1 + np.exp(-linear)), "yes", "no")
    names = [f"{number:05d}" for number in patient]
    return pd.DataFrame({"patient": names, "smoker": smoker, "age": age, "sex": sex, "died": died})


def run(
    folder: Path,
    frame: pd.DataFrame,
    formula: str = "died ~ smoker + age + sex",
    audience: str = "shareable",
    records: str = "",
    patient: str = "",
) -> tuple[dict[str, Any], str]:
    frame.to_csv(folder / "records.csv", index=False)
    text = PLAN.format(formula=formula, audience=audience, records=records, patient=patient)
    (folder / "plan.toml").write_text(text, encoding="utf-8")
    made = run_plan(folder / "plan.toml")
    results = json.loads(next(made.folder.glob("results*.json")).read_text(encoding="utf-8"))
    jsonschema.validate(results, results_schema())
    return results, next(made.folder.glob("report*.html")).read_text(encoding="utf-8")


def matrix(frame: pd.DataFrame) -> tuple[Any, Any]:
    columns = [frame.smoker == "former", frame.smoker == "current", frame.sex == "male", frame.age]
    X = np.column_stack([np.ones(len(frame)), *columns]).astype(float)
    return X, (frame.died == "yes").to_numpy(float)


def clustered(X: Any, y: Any, groups: Any) -> Any:
    kinds = {"groups": pd.factorize(groups)[0], "use_correction": True}
    return sm.Logit(y, X).fit(disp=0, tol=1e-14, maxiter=100, cov_type="cluster", cov_kwds=kinds)


def test_the_interval_that_leads_is_that_of_statsmodels_with_student_s_t(tmp_path: Path) -> None:
    frame = invented()
    results, report = run(tmp_path, frame)
    model = results["models"][0]
    X, y = matrix(frame)
    reference = clustered(X, y, frame.patient)
    quantile = stats.t(df=119).ppf(0.975)
    found = {(one["term"], one["level"]): one for one in model["coefficients"]}
    places = (
        (("smoker", "former"), 1, 1),
        (("smoker", "current"), 2, 1),
        (("sex", "male"), 3, 1),
        (("age", None), 4, 10),
    )
    for key, position, per in places:
        one, error = found[key], per * reference.bse[position]
        assert one["standard_error"] == pytest.approx(error, rel=1e-8)
        limits = np.exp(per * reference.params[position] + np.array([-1, 1]) * quantile * error)
        assert [one["wald"]["lower"], one["wald"]["upper"]] == pytest.approx(limits, rel=1e-8)
        assert one["wald"]["df"] == 119
        t = reference.params[position] / reference.bse[position]
        assert one["wald"]["p"] == pytest.approx(2 * stats.t(df=119).sf(abs(t)), rel=1e-6)
        assert one["profile"] == {"lower": None, "upper": None}
        assert "not independent" in one["reasons"]["profile"]
    assert model["variant"]["covariance"] == "cluster-robust"
    assert model["groups"] == 120
    assert f"{len(frame)} records of 120 groups" in report
    assert "Cameron AC, Miller DL" in report
    assert "Venzon" not in report


def test_crude_intervals_allow_for_groups_too(tmp_path: Path) -> None:
    frame = invented()
    results, _ = run(tmp_path, frame)
    X, y = matrix(frame)
    reference = clustered(X[:, :3], y, frame.patient)
    quantile = stats.t(df=119).ppf(0.975)
    found = {one["level"]: one["crude"] for one in results["models"][0]["coefficients"] if one["term"] == "smoker"}
    for level, position in (("former", 1), ("current", 2)):
        limits = np.exp(reference.params[position] + np.array([-1, 1]) * quantile * reference.bse[position])
        assert [found[level]["wald"]["lower"], found[level]["wald"]["upper"]] == pytest.approx(limits, rel=1e-8)
        assert found[level]["profile"] is None


def test_answers_that_need_a_likelihood_are_not_given(tmp_path: Path) -> None:
    results, report = run(tmp_path, invented())
    model = results["models"][0]
    for name in ("log_likelihood", "null_log_likelihood"):
        assert model[name] is None
        assert "not independent" in model["reasons"][name]
    for term in model["terms"]:
        assert term["likelihood_ratio"] is None
        assert term["p"] is None
        assert "not independent" in term["reasons"]["likelihood_ratio"]
    checks = model["checks"]
    for name, statistic in (
        ("hosmer_lemeshow", "p"),
        ("residual_tests", "pearson_p"),
        ("residual_tests", "deviance_p"),
        ("auc", "lower"),
        ("auc", "standard_error"),
        ("linearity", "smallest_p"),
    ):
        assert checks[name][statistic] is None
        assert "independent" in checks[name]["reasons"][statistic]
    assert checks["auc"]["estimate"] is not None
    assert "Woolf" not in report


def test_terms_are_tested_by_wald_s_f(tmp_path: Path) -> None:
    frame = invented()
    results, _ = run(tmp_path, frame)
    X, y = matrix(frame)
    reference = clustered(X, y, frame.patient)
    L = np.eye(5)[[1, 2]]
    told = L @ reference.params
    expected = told @ np.linalg.solve(L @ reference.cov_params() @ L.T, told) / 2
    wald = next(term["wald"] for term in results["models"][0]["terms"] if term["term"] == "smoker")
    assert wald["f"] == pytest.approx(expected, rel=1e-7)
    assert (wald["df"], wald["df_denominator"]) == (2, 119)
    assert wald["p"] == pytest.approx(stats.f(2, 119).sf(expected), rel=1e-6)


def test_a_term_within_an_interaction_is_tested_in_the_model_without_it(tmp_path: Path) -> None:
    frame = invented()
    results, _ = run(tmp_path, frame, formula="died ~ smoker * sex + age")
    reference = clustered(*matrix(frame), frame.patient)
    L = np.eye(5)[[1, 2]]
    told = L @ reference.params
    expected = told @ np.linalg.solve(L @ reference.cov_params() @ L.T, told) / 2
    terms = {term["term"]: term["wald"] for term in results["models"][0]["terms"]}
    assert terms["smoker"]["f"] == pytest.approx(expected, rel=1e-7)
    assert terms["smoker:sex"]["df"] == 2


def test_an_identifier_that_repeats_does_not_stop_where_it_names_the_groups(tmp_path: Path) -> None:
    results, _ = run(tmp_path, invented(), patient='kind = "identifier"')
    codes = {one["code"] for one in (*results["findings"], *results["models"][0]["findings"])}
    assert "identifier-repeats" not in codes
    assert "records-of-groups" in codes


@pytest.mark.parametrize(("groups", "code"), [(9, "groups-too-few"), (25, "groups-few"), (60, None)])
def test_few_groups_are_told(tmp_path: Path, groups: int, code: str | None) -> None:
    frame = invented(groups=60, seed=5)
    frame["patient"] = (pd.factorize(frame.patient)[0] % groups).astype(str)
    results, report = run(tmp_path, frame)
    codes = [one["code"] for one in results["models"][0]["findings"] if one["code"].startswith("groups-")]
    assert codes == ([] if code is None else [code])
    if code == "groups-too-few":
        assert "among the adjustment columns" in report


def test_records_without_a_group_are_left_out_and_counted(tmp_path: Path) -> None:
    frame = invented()
    frame.loc[frame.index[:11], "patient"] = "NA"
    results, _ = run(tmp_path, frame)
    left_out = {one["code"]: one["records"] for one in results["models"][0]["left_out"]}
    assert left_out == {"group-not-recorded": 11}


def test_a_level_of_a_single_group_has_no_standard_error(tmp_path: Path) -> None:
    frame = invented()
    frame.loc[frame.smoker == "former", "smoker"] = "never"
    largest = frame.patient.value_counts().index[0]
    frame.loc[frame.patient == largest, "smoker"] = "former"
    frame.loc[frame.index[frame.patient == largest][:2], "died"] = ["yes", "no"]
    results, _ = run(tmp_path, frame, audience="internal")
    one = next(one for one in results["models"][0]["coefficients"] if one["level"] == "former")
    assert one["odds_ratio"] is not None
    assert one["standard_error"] is None
    assert one["wald"]["lower"] is None
    assert "single group" in one["reasons"]["standard_error"]
    assert one["crude"]["wald"] is None


def test_a_single_group_gives_no_interval_at_all(tmp_path: Path) -> None:
    frame = invented()
    frame["patient"] = "1"
    results, _ = run(tmp_path, frame)
    for one in results["models"][0]["coefficients"]:
        assert one["odds_ratio"] is not None
        assert one["wald"]["lower"] is None


def test_counts_stand_for_as_many_records_of_a_group(tmp_path: Path) -> None:
    frame = invented()
    apart, _ = run(tmp_path, frame)
    together = frame.groupby(list(frame.columns), sort=False).size().rename("n").reset_index()
    (tmp_path / "again").mkdir()
    counted, _ = run(tmp_path / "again", together, records='count = "n"')
    for one, other in zip(apart["models"][0]["coefficients"], counted["models"][0]["coefficients"], strict=True):
        assert other["standard_error"] == pytest.approx(one["standard_error"], rel=1e-10)


@pytest.mark.parametrize(
    ("formula", "records", "said"),
    [
        ("smoker + C(patient)", "", "names the groups"),
        ("smoker", 'count = "patient"', "cannot both count"),
    ],
)
def test_what_cannot_be_combined(tmp_path: Path, formula: str, records: str, said: str) -> None:
    with pytest.raises(InputFault, match=said):
        run(tmp_path, invented(), formula=formula, records=records, patient='kind = "category"')


def test_a_column_that_is_not_there_is_told(tmp_path: Path) -> None:
    with pytest.raises(InputFault, match="no column"):
        run(tmp_path, invented().rename(columns={"patient": "person"}))
