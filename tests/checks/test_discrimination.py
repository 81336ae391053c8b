"""Precision and recall against scikit-learn; Tjur's D and the measures named after R² against statsmodels."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
import statsmodels.api as sm
from sklearn.metrics import average_precision_score, precision_recall_curve

from oddsmodel.checks.discrimination import average_precision, check, precision_and_recall
from oddsmodel.checks.pseudo_r2 import Gain, expected_shrinkage, null_log_likelihood

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated
from form_on_disk import on_disk, single_rows, ward_model
from grouped_models import grouped


@pytest.mark.parametrize("digits", [6, 1])
def test_precision_and_recall_against_scikit_learn(digits: int) -> None:
    X, y = simulated(800, [-1.2, 0.8, 0.4], seed=3)
    X = np.round(X, digits)
    model = record_model(X, y)
    result = check(model)
    p = 1 / (1 + np.exp(-X @ model.fit.coefficients))
    score = np.round(p, 9)
    assert result.statistics["average_precision"] == pytest.approx(average_precision_score(y, score), rel=1e-9)
    values, index = np.unique(score, return_inverse=True)
    events, records = np.bincount(index, weights=y), np.bincount(index).astype(float)
    recall, precision = precision_and_recall(events, records)
    expected_precision, expected_recall, _ = precision_recall_curve(y, score)
    assert precision == pytest.approx(expected_precision[:-1][::-1], rel=1e-12)
    assert recall == pytest.approx(expected_recall[:-1][::-1], rel=1e-12)
    assert len(values) == len(recall)
    points = result.figures[0].points
    assert len(points) <= 200
    assert points[-1][0] == 1.0
    assert all(0 < share <= 1 for _, share in points)


def test_named_measures_against_statsmodels() -> None:
    X, y = simulated(500, [-0.5, 0.9, -0.3], seed=8)
    result = check(record_model(np.round(X, 1), y)).statistics
    fit = sm.Logit(y, np.round(X, 1)).fit(disp=0, tol=1e-12)
    p = fit.predict()
    assert result["mcfadden"] == pytest.approx(fit.prsquared, rel=1e-9)
    glm = sm.GLM(y, np.round(X, 1), family=sm.families.Binomial()).fit()
    assert result["cox_snell"] == pytest.approx(glm.pseudo_rsquared("cs"), rel=1e-7)
    most = 1 - np.exp(2 * fit.llnull / 500)
    assert result["nagelkerke"] == pytest.approx(glm.pseudo_rsquared("cs") / most, rel=1e-7)
    assert result["tjur"] == pytest.approx(p[y == 1].mean() - p[y == 0].mean(), rel=1e-7)
    assert result["event_share"] == y.mean()


def test_spector_and_mazzeo() -> None:
    """Log-likelihood −12.8896 (Spector & Mazzeo 1980; Greene, Econometric Analysis) of 32 records with 11 events."""
    data = sm.datasets.spector.load_pandas()
    X = sm.add_constant(data.exog.to_numpy(), prepend=True)
    result = check(record_model(X, data.endog.to_numpy())).statistics
    null = 11 * np.log(11 / 32) + 21 * np.log(21 / 32)
    assert result["mcfadden"] == pytest.approx(1 - 12.8896 / -null, abs=1e-5)


def test_null_log_likelihood_and_shrinkage() -> None:
    y = np.repeat([1.0, 0.0], [13, 29])
    assert null_log_likelihood(42, 13) == pytest.approx(sm.Logit(y, np.ones(42)).fit(disp=0).llf, rel=1e-9)
    assert expected_shrinkage(40.0, 4) == pytest.approx(0.9)
    assert expected_shrinkage(4.0, 4) is None
    perfect = Gain(0.0, null_log_likelihood(42, 13), 42)
    assert (perfect.mcfadden, perfect.nagelkerke) == pytest.approx((1.0, 1.0))
    assert perfect.cox_snell == pytest.approx(perfect.most)


def test_what_is_left_out() -> None:
    X, y = simulated(300, [0.0, 0.7])
    sampled = check(record_model(X, y, design="case-control"))
    assert set(sampled.statistics.values()) == {None}
    assert "case-control" in sampled.reasons["tjur"]
    assert sampled.line == ""
    whole = check(grouped())
    assert whole.statistics["average_precision"] is not None
    assert whole.statistics["tjur"] is not None
    assert whole.statistics["nagelkerke"] is None
    assert [row[0] for row in whole.tables[0].rows] == [
        "Average precision",
        "Tjur’s D, the coefficient of discrimination",
    ]
    every = check(grouped_model([[-1.0], [1.0]], [5, 5], [5, 5], exposed=(0,), intercept=False))
    assert "same outcome" in every.reasons["average_precision"]


def test_a_coin_has_the_share_of_events() -> None:
    assert average_precision(np.array([30.0]), np.array([100.0])) == pytest.approx(0.3)
    assert average_precision(np.array([0.0, 30.0]), np.array([70.0, 30.0])) == pytest.approx(1.0)


def test_rows_on_disk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    one = check(ward_model(4000)).statistics
    single_rows(monkeypatch)
    filed = on_disk(ward_model(4000), tmp_path / "rows")
    assert check(filed).statistics == pytest.approx(one, rel=1e-8)
