"""Area under the ROC curve against published values, scikit-learn and every pair counted."""

from __future__ import annotations

import sys
import time
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import expit, logit
from sklearn.metrics import roc_auc_score, roc_curve

from oddsmodel.checks.roc import MOST_POINTS, area_under_curve, check

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated

NORMAL = np.array([33.0, 6, 6, 11, 2])
ABNORMAL = np.array([3.0, 2, 2, 11, 33])


def test_hanley_and_mcneil_1982() -> None:
    # published checks, row 11: area 0.893, standard error by DeLong et al. 1988 0.0307
    answer = area_under_curve(ABNORMAL, NORMAL)
    assert answer.area == pytest.approx(0.893, abs=5e-4)
    assert answer.standard_error == pytest.approx(0.0307, abs=5e-5)


def test_the_same_scans_as_a_fitted_model() -> None:
    X = np.column_stack([np.ones(5), np.arange(1.0, 6.0)])
    result = check(grouped_model(X, ABNORMAL, NORMAL + ABNORMAL))
    assert result.name == "auc"
    area, error = result.statistics["estimate"], result.statistics["standard_error"]
    assert area == pytest.approx(0.893, abs=5e-4)
    # interval on the logit scale, delta method, by hand
    reach = 1.959963985 * error / (area * (1 - area))
    assert result.statistics["lower"] == pytest.approx(expit(logit(area) - reach), rel=1e-8)
    assert result.statistics["upper"] == pytest.approx(expit(logit(area) + reach), rel=1e-8)


def pairs(events: np.ndarray, others: np.ndarray) -> tuple[float, float | None]:
    """DeLong et al. 1988 with the matrix of all pairs."""
    one = np.repeat(np.arange(events.size), events.astype(int))
    zero = np.repeat(np.arange(others.size), others.astype(int))
    psi = (one[:, None] > zero) + 0.5 * (one[:, None] == zero)
    if min(one.size, zero.size) < 2:
        return float(psi.mean()), None
    variance = psi.mean(axis=1).var(ddof=1) / one.size + psi.mean(axis=0).var(ddof=1) / zero.size
    return float(psi.mean()), float(np.sqrt(variance))


@settings(deadline=None, derandomize=True, max_examples=80)
@given(st.lists(st.tuples(st.integers(0, 4), st.integers(0, 4)), min_size=1, max_size=12))
def test_every_pair_counted(counts: list[tuple[int, int]]) -> None:
    events, others = np.array(counts, dtype=float).T
    if not (events.any() and others.any()):
        return
    answer = area_under_curve(events, others)
    area, error = pairs(events, others)
    assert answer.area == pytest.approx(area, abs=1e-12)
    assert (answer.standard_error is None) == (error is None)
    if error is not None:
        assert answer.standard_error == pytest.approx(error, abs=1e-10)


def test_scikit_learn_agrees_and_the_curve_is_its_curve() -> None:
    X, y = simulated(2500, [-1.0, 0.8, 0.5])
    X = np.round(X, 1)
    model = record_model(X, y)
    result = check(model)
    score = X @ model.fit.coefficients
    assert result.statistics["estimate"] == pytest.approx(roc_auc_score(y, np.round(score, 9)), rel=1e-12)
    points = result.figures[0].points
    assert len(points) <= MOST_POINTS
    assert points[0] == (0.0, 0.0)
    assert points[-1] == (1.0, 1.0)
    false_share, true_share, _ = roc_curve(y, np.round(score, 9), drop_intermediate=False)
    known = {(round(a, 12), round(b, 12)) for a, b in zip(false_share, true_share, strict=True)}
    assert {(round(a, 12), round(b, 12)) for a, b in points} <= known
    area = np.trapezoid([b for _, b in points], [a for a, _ in points])
    assert area == pytest.approx(result.statistics["estimate"], abs=5e-3)


def test_no_interval_where_there_is_none() -> None:
    flat = check(grouped_model([[1.0]], [4], [10], exposed=()))
    assert flat.statistics["estimate"] == 0.5
    assert flat.statistics["lower"] is None
    assert "same place" in flat.reasons["lower"]
    x = np.linspace(-1, 1, 21)
    y = np.zeros(21)
    y[12] = 1
    alone = check(grouped_model(np.column_stack([np.ones(21), x]), y))
    assert alone.statistics["standard_error"] is None
    assert "at least two" in alone.reasons["upper"]
    # without an intercept, records that all have the event can have a finite fit
    every = check(grouped_model([[-1.0], [1.0]], [5, 5], [5, 5], exposed=(0,), intercept=False))
    assert every.statistics["estimate"] is None
    # and records apart can too
    apart = check(grouped_model([[1.0], [2.0]], [0, 5], [5, 5], exposed=(0,), intercept=False))
    assert apart.statistics["estimate"] == 1.0
    assert apart.statistics["lower"] is None
    assert "one side" in apart.reasons["lower"]


def test_area_of_one_has_no_interval() -> None:
    answer = area_under_curve(np.array([0.0, 0, 4, 5]), np.array([3.0, 7, 0, 0]))
    assert answer.area == 1.0
    assert answer.standard_error == 0.0


def test_a_million_records_in_seconds() -> None:
    rng = np.random.default_rng(2)
    x = rng.normal(size=1_000_000)
    y = (rng.random(x.size) < expit(-2 + x)).astype(float)
    model = grouped_model(np.column_stack([np.ones(x.size), x]), y)
    started = time.perf_counter()
    result = check(model)
    assert time.perf_counter() - started < 5.0
    assert result.statistics["estimate"] == pytest.approx(roc_auc_score(y, x), abs=1e-9)
