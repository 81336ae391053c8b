"""The sizes that criteria for prediction models ask for: published examples and the criteria themselves."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest

from oddsmodel.checks.sample_size_for_prediction import (
    check,
    size_for_mean_error,
    size_for_optimism,
    size_for_overall_risk,
    size_for_shrinkage,
)

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated
from grouped_models import grouped


def test_published_example() -> None:
    """Riley et al. 2020, pre-eclampsia: 30 parameters, share 0.05, R² 0.05: 5249, 73 and 544 records (from memory)."""
    assert size_for_shrinkage(30, 0.05) == 5249
    assert size_for_overall_risk(0.05) == 73
    assert size_for_mean_error(30, 0.05) == 544


@pytest.mark.parametrize(("parameters", "r2", "share"), [(5, 0.1, 0.3), (20, 0.02, 0.04), (12, 0.3, 0.5)])
def test_sizes_do_what_they_promise(parameters: int, r2: float, share: float) -> None:
    """Solved the other way: what is expected with so many records, and with one fewer.

    With the R² of the population, the one found among n records is R²/S with S the shrinkage, and S itself is
    1 + p / (n log(1 − R²/S)) (Riley et al. 2019, equations 7 and 11, from memory).
    """
    n = size_for_shrinkage(parameters, r2)
    expected = [1 + parameters / (size * np.log(1 - r2 / 0.9)) for size in (n - 1, n)]
    assert expected[0] < 0.9 <= expected[1] + 1e-12
    most = 1 - np.exp(2 * (share * np.log(share) + (1 - share) * np.log(1 - share)))
    n = size_for_optimism(parameters, r2, most)
    shrinkage = r2 / (r2 + 0.05 * most)
    # Nagelkerke's R² is r2/most in truth, and r2/shrinkage/most as found
    assert (r2 / shrinkage - r2) / most == pytest.approx(0.05)
    assert n == size_for_shrinkage(parameters, r2, shrinkage)
    n = size_for_overall_risk(share)
    reach = [1.959964 * np.sqrt(share * (1 - share) / size) for size in (n - 1, n)]
    assert reach[0] > 0.05 >= reach[1]
    n = size_for_mean_error(parameters, share)
    logs = [-0.508 + 0.259 * np.log(share) + 0.504 * np.log(parameters) - 0.544 * np.log(size) for size in (n - 1, n)]
    assert np.exp(logs[0]) > 0.05 >= np.exp(logs[1])


def test_expected_shrinkage_and_the_verdicts() -> None:
    X, y = simulated(4000, [-0.7, 0.8, 0.4], seed=1)
    many = check(record_model(X, y))
    assert many.verdict == "fine"
    assert many.statistics["expected_shrinkage"] > 0.99
    assert many.statistics["needed"] == max(
        many.statistics[f"needed_for_{one}"] for one in ("shrinkage", "mean_error", "optimism", "overall_risk")
    )
    assert many.findings == ()
    X, y = simulated(150, [-0.7, 0.6, *[0.05] * 8], seed=1)
    model = record_model(X, y)
    few = check(model)
    null = y.sum() * np.log(y.mean()) + (150 - y.sum()) * np.log(1 - y.mean())
    ratio = 2 * (model.fit.log_likelihood - null)
    assert few.statistics["expected_shrinkage"] == pytest.approx(1 - 9 / ratio, rel=1e-9)
    assert few.verdict == "caution"
    assert few.findings[0].code == "too-few-records-for-prediction"
    r2 = (1 - 9 / ratio) * (1 - np.exp(-ratio / 150))
    assert few.statistics["needed_for_shrinkage"] == size_for_shrinkage(9, r2)
    assert few.tables[0].rows[0][2] == size_for_shrinkage(9, 0.15 * (1 - np.exp(2 * null / 150)))


def test_columns_of_noise_have_no_size() -> None:
    for seed in range(20):
        X, y = simulated(100, [0.0] * 6, seed=seed)
        model = record_model(X, y)
        result = check(model)
        if result.statistics["expected_shrinkage"] is None:
            break
    assert result.verdict == "caution"
    assert result.statistics["needed"] is None
    assert "noise" in result.line
    assert result.statistics["needed_for_overall_risk"] is not None
    assert set(result.reasons) >= {"needed", "needed_for_shrinkage", "needed_for_optimism", "expected_shrinkage"}


def test_what_is_left_out() -> None:
    X, y = simulated(300, [0.0, 0.7])
    sampled = check(record_model(X, y, design="case-control"))
    assert sampled.statistics["needed_for_shrinkage"] is not None
    for one in ("optimism", "overall_risk", "mean_error"):
        assert sampled.statistics[f"needed_for_{one}"] is None
        assert "case-control" in sampled.reasons[f"needed_for_{one}"]
    assert check(grouped()).verdict == "not applicable"
    assert "no column" in check(record_model(np.ones((50, 1)), np.repeat([0.0, 1.0], 25), exposed=())).line
    every = check(grouped_model([[-1.0], [1.0]], [5, 5], [5, 5], exposed=(0,), intercept=False))
    assert every.verdict == "not applicable"
    X, y = simulated(2000, [-0.5, 0.5, *[0.1] * 31], seed=2)
    wide = check(record_model(X, y))
    assert wide.statistics["needed_for_mean_error"] is None
    assert "up to 30" in wide.reasons["needed_for_mean_error"]
