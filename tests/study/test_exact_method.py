"""Exact conditional inference by way of a plan, against scipy for the 2×2 table and full enumeration."""

from __future__ import annotations

import csv
import sys
from pathlib import Path

import jsonschema
import numpy as np
import pytest
from scipy import stats
from scipy.stats.contingency import odds_ratio

from oddsmodel.export.results_json import results_schema
from oddsmodel.inference import Budget
from oddsmodel.study import exact
from oddsmodel.study.changes import changes

sys.path.insert(0, str(Path(__file__).parent))
from method_runs import ORDERED, coefficient, matrix, records, report, run, table


@pytest.mark.parametrize("cells", [(2, 9, 8, 11), (0, 8, 6, 9), (7, 0, 4, 9)])
def test_exact_inference_for_one_binary_exposure_is_that_of_the_table(
    tmp_path: Path, cells: tuple[int, int, int, int]
) -> None:
    a, b, c, d = cells
    outcome, results = run(tmp_path, table(*cells), "prophylaxis", 'method = "exact"', records='count = "n"')
    (model,) = results["models"]
    one = coefficient(model, "prophylaxis")
    reference = odds_ratio([[a, b], [c, d]], kind="conditional")
    low, high = reference.confidence_interval(0.95)
    assert one["exact"]["lower"] == (pytest.approx(low, rel=1e-7) if low > 0 else None)
    assert one["exact"]["upper"] == (pytest.approx(high, rel=1e-7) if np.isfinite(high) else None)
    if 0 < reference.statistic < np.inf:
        assert one["odds_ratio"] == pytest.approx(reference.statistic, rel=1e-7)
    else:
        assert one["odds_ratio"] is None
        assert "median-unbiased estimate is finite" in one["reasons"]["odds_ratio"]
        assert one["exact"]["median_unbiased"] > 0
        assert "The median-unbiased estimate is" in report(outcome)
    assert one["exact"]["p_by_probability"] == pytest.approx(stats.fisher_exact([[a, b], [c, d]])[1], rel=1e-9)
    assert not outcome.not_estimated
    assert model["status"] == "converged"
    assert one["standard_error"] is one["wald"]["lower"] is one["profile"]["lower"] is None
    assert one["reasons"]["wald"]
    jsonschema.validate(results, results_schema())
    with (outcome.folder / "tables" / "estimates-INTERNAL.csv").open(encoding="utf-8", newline="") as file:
        row = next(row for row in csv.DictReader(file) if row["term"] == "prophylaxis")
    for column, key in (("exact_lower", "lower"), ("exact_upper", "upper"), ("median_unbiased", "median_unbiased")):
        assert (float(row[column]) if row[column] else None) == one["exact"][key]


def test_exact_inference_given_other_columns_by_enumeration(tmp_path: Path) -> None:
    """All 2^14 outcomes, those with the observed sums of the other columns."""
    frame = records(14, seed=21).assign(age=lambda one: 30 + 10 * (one.age % 3))
    _, results = run(tmp_path, frame, more='method = "exact"')
    X, y = matrix(frame, "prophylaxis", "age", "dirty")
    every = ((np.arange(2**14)[:, None] >> np.arange(14)) & 1).astype(float)
    sums = every @ X
    alike = (sums[:, [0, 2, 3]] == (y @ X)[[0, 2, 3]]).all(axis=1)
    values, ways = np.unique(sums[alike, 1], return_counts=True)
    observed = float(y @ X[:, 1])

    def tail(theta: float, upper: bool) -> float:
        weight = ways * np.exp(theta * values)
        within = values >= observed if upper else values <= observed
        return float(weight[within].sum() / weight.sum())

    exactly = coefficient(results["models"][0], "prophylaxis")["exact"]
    for name, upper in (("lower", True), ("upper", False)):
        if exactly[name] is None:
            assert observed == (values.min() if upper else values.max())
        else:
            assert tail(np.log(exactly[name]), upper) == pytest.approx(0.025, rel=1e-7)
    assert exactly["p_doubled"] == pytest.approx(min(1.0, 2 * min(tail(0.0, True), tail(0.0, False))), rel=1e-9)
    dirty = coefficient(results["models"][0], "dirty")
    assert dirty["odds_ratio"] is None
    assert "Conditioned upon" in dirty["reasons"]["odds_ratio"]


@pytest.mark.parametrize(
    ("limit", "budget"),
    [
        ("states", Budget(states=200, seconds=None)),
        ("bytes", Budget(bytes=50_000, seconds=None)),
        ("work", Budget(seconds=None, work=2000)),
    ],
)
def test_exact_inference_beyond_its_budget_says_how_far_it_came(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, limit: str, budget: Budget
) -> None:
    monkeypatch.setattr(exact, "BUDGET", budget)
    outcome, results = run(tmp_path, records(60), more='method = "exact"')
    (model,) = results["models"]
    assert outcome.not_estimated
    assert model["status"] == "not estimated"
    assert model["coefficients"] == []
    stop = model["findings"][-1]
    assert stop["code"] == "exact-beyond-budget"
    assert 0 < stop["facts"]["done"] < stop["facts"]["patterns"]
    assert f"after {stop['facts']['done']} of" in stop["message"]
    assert stop["facts"]["limit"] == limit
    assert "could not be estimated" in report(outcome)


def test_exact_inference_of_a_column_with_too_many_values_is_refused(tmp_path: Path) -> None:
    frame = records(40).assign(age=np.exp(np.linspace(3.0, 4.0, 40)) / 7.0)
    outcome, results = run(tmp_path, frame, more='method = "exact"')
    assert outcome.not_estimated
    assert "takes so many different values" in results["models"][0]["findings"][-1]["message"]


def test_what_exact_inference_does_not_have_is_told(tmp_path: Path) -> None:
    more = 'method = "exact"\ntrend = ["ward"]'
    outcome, _ = run(tmp_path, records(60), "ward", more, exposures=("ward",), ward=ORDERED)
    (model,) = outcome.results.models
    assert [trend.reason for trend in model.trends] == [
        "Exact inference gives limits and p-values for each coefficient of the exposure, and neither trends nor "
        "averages of levels."
    ]
    assert model.terms == ()
    assert {one.name for one in model.checks} == {"counting", "sparse_cells", "overlap", "independence"}


def test_a_series_of_exact_results_has_their_exact_limits(tmp_path: Path) -> None:
    paths, limits = [], []
    for name, cells in (("spring", (2, 9, 8, 11)), ("autumn", (5, 19, 13, 20))):
        (tmp_path / name).mkdir()
        counts = 'count = "n"'
        outcome, results = run(tmp_path / name, table(*cells), "prophylaxis", 'method = "exact"', records=counts)
        paths.append(outcome.folder / "results-INTERNAL.json")
        exactly = coefficient(results["models"][0], "prophylaxis")["exact"]
        limits.append((exactly["lower"], exactly["upper"]))
    (model,) = changes(paths).models
    assert model.figure is not None
    assert [(mark.lower, mark.upper) for mark in model.figure.marks] == limits
