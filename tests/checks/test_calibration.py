"""Calibration groups, Wilson's interval and the smooth curve against scikit-learn and statsmodels."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
from sklearn.calibration import calibration_curve
from statsmodels.nonparametric.smoothers_lowess import lowess
from statsmodels.stats.proportion import proportion_confint

from oddsmodel.checks.calibration import check, wilson
from oddsmodel.checks.smooth import smooth_share

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated


def test_groups_agree_with_scikit_learn() -> None:
    X, y = simulated(2000, [-0.7, 0.9, 0.3])
    model = record_model(X, y)
    groups = check(model).figures[0].groups
    probability = 1 / (1 + np.exp(-X @ model.fit.coefficients))
    observed, predicted = calibration_curve(y, probability, n_bins=10, strategy="quantile")
    assert [group.predicted for group in groups] == pytest.approx(predicted.tolist(), abs=1e-9)
    assert [group.observed for group in groups] == pytest.approx(observed.tolist(), abs=1e-12)
    assert sum(group.records for group in groups) == 2000
    assert sum(group.events for group in groups) == y.sum()


def test_wilson_against_statsmodels() -> None:
    events, records = np.array([0.0, 1, 5, 20, 37, 40]), np.array([7.0, 1, 11, 400, 40, 40])
    lower, upper = wilson(events, records, 0.9)
    expected = proportion_confint(events, records, alpha=0.1, method="wilson")
    assert lower == pytest.approx(expected[0], abs=1e-12)
    assert upper == pytest.approx(expected[1], abs=1e-12)


def test_smooth_against_statsmodels_lowess() -> None:
    # Cleveland 1979 without robust steps, all weights one: statsmodels' lowess at the same values
    rng = np.random.default_rng(0)
    x = np.sort(rng.uniform(0.05, 0.9, 400))
    y = (rng.random(400) < x**2).astype(float)
    curve = smooth_share(x, np.ones(400), y)
    values = np.array([point[0] for point in curve])
    reference = lowess(y, x, frac=0.75, it=0, xvals=values)
    assert np.array([point[1] for point in curve]) == pytest.approx(np.clip(reference, 0, 1), abs=2e-3)


def test_counts_smooth_as_repeated_records() -> None:
    rng = np.random.default_rng(1)
    x = np.sort(rng.uniform(size=40))
    records = rng.integers(1, 30, 40).astype(float)
    events = rng.binomial(records.astype(int), x).astype(float)
    grouped = np.array(smooth_share(x, records, events))
    both = np.column_stack([events, records - events]).astype(int)
    repeated = np.repeat(np.tile([1.0, 0.0], 40), both.ravel())
    single = np.array(smooth_share(np.repeat(x, records.astype(int)), np.ones(repeated.size), repeated))
    assert grouped == pytest.approx(single, abs=1e-9)


def test_bins_change_the_curve_little() -> None:
    rng = np.random.default_rng(2)
    x = np.sort(rng.beta(2, 6, 30_000))
    y = (rng.random(x.size) < x).astype(float)
    curve = np.array(smooth_share(x, np.ones(x.size), y))
    values, smooth = curve.T
    reference = lowess(y, x, frac=0.75, it=0, xvals=values, delta=0.0)
    assert smooth == pytest.approx(reference, abs=2e-3)


def test_no_curve_from_few_records_or_values() -> None:
    x = np.linspace(0.1, 0.9, 12)
    assert smooth_share(x, np.ones(12), np.zeros(12)) == ()
    assert smooth_share(x[:4], np.full(4, 50.0), np.full(4, 20.0)) == ()
    heap = np.array([99_000.0, *np.ones(11)])
    assert smooth_share(x, heap, np.zeros(12)) == ()
    mostly = smooth_share(x, np.array([900.0, *np.full(11, 10.0)]), np.array([90.0, *np.full(11, 5.0)]))
    assert all(0 <= share <= 1 for _, share in mostly)


@pytest.mark.parametrize("design", ["case-control", "matched case-control"])
def test_case_control_studies_have_no_calibration(design: str) -> None:
    X, y = simulated(300, [0.0, 0.7])
    result = check(record_model(X, y, design=design))
    assert result.figures == ()
    assert result.verdict == "not applicable"
    assert design in result.line
    assert set(result.statistics.values()) == {None}
    assert set(result.reasons) == set(result.statistics)


def test_a_bent_relation_is_worth_a_look() -> None:
    rng = np.random.default_rng(5)
    x = rng.normal(size=30_000)
    y = (rng.random(x.size) < 1 / (1 + np.exp(-(-1 + 0.5 * x + 0.6 * x**2)))).astype(float)
    result = check(record_model(np.column_stack([np.ones(x.size), x]), y))
    assert result.verdict == "look"
    assert result.findings[0].code == "calibration-departs"
    straight = (rng.random(x.size) < 1 / (1 + np.exp(-(-1 + 0.5 * x)))).astype(float)
    assert check(record_model(np.column_stack([np.ones(x.size), x]), straight)).verdict == "fine"


def test_tiny_data_and_one_event() -> None:
    x = np.linspace(-1, 1, 15)
    y = np.zeros(15)
    y[8] = 1
    result = check(record_model(np.column_stack([np.ones(15), x]), y))
    assert result.verdict == "fine"
    assert result.figures[0].smooth == ()
    saturated = check(grouped_model([[1, 0], [1, 1]], [10, 20], [50, 50]))
    assert saturated.statistics["mean_gap"] == pytest.approx(0.0, abs=1e-9)
    every = check(grouped_model([[-1.0], [1.0]], [5, 5], [5, 5], exposed=(0,), intercept=False))
    assert every.line
