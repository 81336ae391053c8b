"""Pearson and deviance statistics against statsmodels."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.stats import chi2

from oddsmodel.checks.residual_tests import check
from oddsmodel.checks.residuals import pattern_residuals

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, vaso

# Tobacco budworm, Collett 1991; Venables & Ripley 2002, section 7.2 (published checks, row 9)
DEAD = np.array([1, 4, 9, 13, 18, 20, 0, 2, 6, 10, 12, 16], dtype=float)
BUDWORM = np.column_stack([np.repeat([0.0, 1.0], 6), np.repeat([1.0, 0.0], 6), np.tile(np.arange(6.0), 2)])


def test_budworm_against_statsmodels() -> None:
    model = grouped_model(BUDWORM, DEAD, np.full(12, 20.0), exposed=(2,), intercept=False)
    result = check(model)
    reference = sm.GLM(np.column_stack([DEAD, 20 - DEAD]), BUDWORM, family=sm.families.Binomial()).fit()
    assert result.statistics["pearson"] == pytest.approx(reference.pearson_chi2, rel=1e-7)
    assert result.statistics["deviance"] == pytest.approx(reference.deviance, rel=1e-7)
    assert result.statistics["df"] == reference.df_resid == 9
    residuals = pattern_residuals(model.rows.passes.arrays, model.fit.coefficients)
    assert residuals.pearson == pytest.approx(reference.resid_pearson, abs=1e-6)
    assert residuals.deviance == pytest.approx(reference.resid_deviance, abs=1e-6)
    # Expected deaths of the lowest doses are below 1: no p
    assert result.statistics["pearson_p"] is None
    assert result.verdict == "not applicable"


def test_vaso_deviance_published() -> None:
    # Pregibon 1981: deviance 29.23 (published checks, row 7)
    X, y = vaso()
    result = check(grouped_model(X, y))
    assert result.statistics["deviance"] == pytest.approx(29.23, abs=5e-3)
    assert result.statistics["deviance_p"] is None
    assert "too few records" in result.reasons["deviance_p"]


def test_large_patterns_get_p_values() -> None:
    X = np.array([[1, a, b] for a in (0, 1) for b in (0, 1, 2)], dtype=float)
    events, trials = np.array([12, 25, 33, 28, 35, 61]), np.full(6, 100)
    result = check(grouped_model(X, events, trials))
    reference = sm.GLM(np.column_stack([events, trials - events]), X, family=sm.families.Binomial()).fit()
    assert result.statistics["pearson_p"] == pytest.approx(chi2.sf(reference.pearson_chi2, 3), rel=1e-6)
    assert result.statistics["deviance_p"] == pytest.approx(chi2.sf(reference.deviance, 3), rel=1e-6)
    assert result.reasons == {}
    bent = check(grouped_model(X, [12, 70, 20, 28, 80, 30], trials))
    assert bent.verdict == "caution"
    assert bent.findings[0].code == "residual-tests-misfit"


def test_a_saturated_model_leaves_nothing_to_test() -> None:
    result = check(grouped_model([[1, 0], [1, 1]], [10, 20], [50, 50]))
    assert result.statistics["df"] == 0
    assert result.statistics["deviance"] == pytest.approx(0.0, abs=1e-9)
    assert result.statistics["deviance_p"] is None
    assert "exactly" in result.line


def test_probabilities_at_the_edge_give_no_warning() -> None:
    X = np.column_stack([np.ones(42), np.append(np.linspace(-1, 1, 41), 1e5)])
    y = (np.arange(42) % 3 == 0).astype(float)
    y[-1] = 1.0
    model = grouped_model(X, y)
    object.__setattr__(model.fit, "coefficients", np.array([-0.5, 0.9]))
    residuals = pattern_residuals(model.rows.passes.arrays, model.fit.coefficients)
    assert residuals.pearson[-1] == 0.0
    assert residuals.deviance[-1] == 0.0
    object.__setattr__(model.fit, "coefficients", np.array([-0.5, -0.9]))
    assert check(model).statistics["pearson"] is None
    assert np.isfinite(check(model).statistics["deviance"])
