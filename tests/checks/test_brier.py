"""The Brier score against scikit-learn."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
from sklearn.metrics import brier_score_loss

from oddsmodel.checks.brier import check

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated


def test_scikit_learn_agrees() -> None:
    X, y = simulated(500, [-1.0, 0.8])
    X = np.round(X, 1)
    model = record_model(X, y)
    result = check(model)
    probability = 1 / (1 + np.exp(-X @ model.fit.coefficients))
    assert result.statistics["score"] == pytest.approx(brier_score_loss(y, probability), rel=1e-10)
    maximum = brier_score_loss(y, np.full(500, y.mean()))
    assert result.statistics["maximum"] == pytest.approx(maximum, rel=1e-10)
    assert result.statistics["scaled"] == pytest.approx(1 - result.statistics["score"] / maximum, rel=1e-9)
    assert result.line == ""


def test_withheld_in_case_control_studies_and_unscaled_with_one_outcome() -> None:
    X, y = simulated(300, [0.0, 0.7])
    result = check(record_model(X, y, design="case-control"))
    assert result.statistics == {"score": None, "maximum": None, "scaled": None}
    assert "case-control" in result.reasons["score"]
    every = check(grouped_model([[-1.0], [1.0]], [5, 5], [5, 5], exposed=(0,), intercept=False))
    assert every.statistics["scaled"] is None
    assert "same outcome" in every.reasons["scaled"]
