"""Findings near the edge: sparse-data bias, limits that disagree, Wald tests that fail; and calm elsewhere."""

from __future__ import annotations

import math
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

sys.path.insert(0, str(Path(__file__).parent))
from method_runs import coefficient, matrix, maximum, penalised, records, report, run, table

EDGE = ("sparse-data-bias", "limits-disagree", "wald-fails")


def findings(results: dict[str, Any]) -> dict[str, dict[str, Any]]:
    return {one["code"]: one for one in results["models"][0]["findings"] if one["code"] in EDGE}


def test_records_enough_are_told_nothing(tmp_path: Path) -> None:
    for seed in range(3):
        (tmp_path / str(seed)).mkdir()
        _, results = run(tmp_path / str(seed), records(500, seed=seed))
        assert findings(results) == {}


def test_sparse_data_bias_is_told_with_both_odds_ratios(tmp_path: Path) -> None:
    """Few events for each coefficient, and an odds ratio that penalised likelihood (here by scipy) puts nearer to 1."""
    frame = records(60, seed=9, prophylaxis=-1.0)
    outcome, results = run(tmp_path, frame, "prophylaxis + age + dirty + ward")
    (model,) = results["models"]
    events = model["events"]
    assert min(events, 60 - events) < 10 * (model["parameters"] - 1)
    told = findings(results)["sparse-data-bias"]["facts"]
    X, y = matrix(frame, "prophylaxis", "age", "dirty", "ward")
    best, _ = maximum(penalised(X / [1, 1, 10, 1, 1, 1], y), np.zeros(6))
    assert told["plain"] == pytest.approx(coefficient(model, "prophylaxis")["odds_ratio"], rel=1e-12)
    assert math.log(told["penalised"]) == pytest.approx(best[1], abs=1e-4)
    assert abs(math.log(told["plain"])) > abs(math.log(told["penalised"])) + math.log(1.1)
    assert "lie too far from 1 on average" in report(outcome)


def test_sparse_data_bias_is_not_told_where_events_are_enough_for_each_coefficient(tmp_path: Path) -> None:
    """Two exposed events, but 32 events for one coefficient."""
    _, results = run(tmp_path, table(2, 20, 30, 150), "prophylaxis", records='count = "n"')
    assert "sparse-data-bias" not in findings(results)


def test_limits_that_disagree_are_a_note(tmp_path: Path) -> None:
    """One event among twenty exposed: the profile likelihood is far from symmetric."""
    _, results = run(tmp_path, table(1, 19, 30, 50), "prophylaxis", records='count = "n"')
    told = findings(results)["limits-disagree"]
    one = coefficient(results["models"][0], "prophylaxis")
    apart = [abs(math.log(one["profile"][end] / one["wald"][end])) for end in ("lower", "upper")]
    assert told["severity"] == "note"
    assert told["facts"]["distance"] == pytest.approx(max(apart) / one["standard_error"], rel=1e-12)
    assert told["facts"]["distance"] > 0.25


def test_a_wald_test_that_a_large_effect_defeats(tmp_path: Path) -> None:
    """Hauck & Donner 1977: age nearly separates the records, but for one pair that stands the wrong way round. The
    likelihood ratio (by statsmodels) is in no doubt, Wald's test is; and with the pair one place further apart, a
    smaller effect, Wald's statistic is larger."""
    age = np.arange(30, 54)
    infected = age > 41
    infected[[11, 12]] = [True, False]
    frame = pd.DataFrame({"infected": np.where(infected, "yes", "no"), "age": age})
    _, results = run(tmp_path, frame, "age", exposures=("age",))
    columns = sm.add_constant(age.astype(float))
    reference = sm.Logit(infected.astype(float), columns).fit(disp=0, tol=1e-12)
    assert reference.llr_pvalue < 1e-5
    assert reference.pvalues[1] > 0.05
    smaller = age > 41
    smaller[[10, 13]] = [True, False]
    other = sm.Logit(smaller.astype(float), columns).fit(disp=0, tol=1e-12)
    assert other.params[1] < reference.params[1]
    assert other.tvalues[1] > reference.tvalues[1]
    told = findings(results)
    assert "no longer grows with it (Hauck & Donner 1977)" in told["wald-fails"]["message"]
    assert told["wald-fails"]["severity"] == "caution"


def test_a_large_effect_of_many_records_is_no_matter(tmp_path: Path) -> None:
    """Wald's statistic falls here too, but it is 30 and its limits are those of the profile likelihood."""
    _, results = run(tmp_path, table(1900, 100, 400, 1600), "prophylaxis", records='count = "n"')
    assert coefficient(results["models"][0], "prophylaxis")["odds_ratio"] == pytest.approx(76.0)
    assert findings(results) == {}


def test_a_small_effect_is_not_taken_for_one(tmp_path: Path) -> None:
    _, results = run(tmp_path, records(80, seed=4, prophylaxis=0.0))
    assert "wald-fails" not in findings(results)


@pytest.mark.parametrize("method", ["penalised", "exact", "log-F"])
def test_other_methods_are_not_measured_against_themselves(tmp_path: Path, method: str) -> None:
    frame = records(40, seed=12, prophylaxis=-2.0).assign(age=lambda one: one.age // 20 * 20)
    more = f'method = "{method}"\n' + ('prior = {m = 1, columns = ["age"]}\n' if method == "log-F" else "")
    _, results = run(tmp_path, frame, more=more)
    assert findings(results) == {}


def test_records_of_groups_are_not_judged_by_a_likelihood(tmp_path: Path) -> None:
    frame = records(60, seed=12).assign(patient=[f"p{k // 2}" for k in range(60)])
    _, results = run(tmp_path, frame, records='grouped_by = "patient"')
    assert findings(results) == {}
