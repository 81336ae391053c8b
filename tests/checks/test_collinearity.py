"""Generalised variance inflation against determinants and least squares computed apart."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from oddsmodel.checks import collinearity

sys.path.insert(0, str(Path(__file__).parent))
from form_models import birth_weights, fitted


def by_determinants(covariance: np.ndarray, positions: list[int]) -> float:
    """Fox & Monette 1992: det(R_11) det(R_22) / det(R) of the correlations of the estimates, no intercept."""
    deviations = np.sqrt(np.diag(covariance))
    R = covariance / np.outer(deviations, deviations)
    rest = [i for i in range(len(R)) if i not in positions]
    return float(
        np.linalg.det(R[np.ix_(positions, positions)]) * np.linalg.det(R[np.ix_(rest, rest)]) / np.linalg.det(R)
    )


def test_parts_agree_with_determinants_of_the_statsmodels_covariance() -> None:
    frame = birth_weights()
    model = fitted("smoke + race + age + lwt + ht", frame, frame["low"] == 1, ["smoke"])
    X = model.design.encode(frame)
    covariance = sm.Logit(frame["low"].to_numpy(), X).fit(disp=0).cov_params()[1:, 1:]
    columns = [column for column in model.design.columns if column.kind != "intercept"]
    for part in collinearity.inflation_by_part(model):
        positions = [i for i, column in enumerate(columns) if column.label in part.label or i + 1 in part.positions]
        assert part.inflation == pytest.approx(by_determinants(covariance, positions), rel=1e-6)


def test_one_column_parts_agree_with_weighted_least_squares() -> None:
    # The variance inflation of one column is 1 / (1 - R^2) of its regression on the others, weighted as in the model
    frame = birth_weights()
    model = fitted("smoke + age + lwt", frame, frame["low"] == 1, ["smoke"])
    X = model.design.encode(frame)
    risk = sm.Logit(frame["low"].to_numpy(), X).fit(disp=0).predict()
    found = {part.positions[0]: part.inflation for part in collinearity.inflation_by_part(model)}
    for i in (1, 2, 3):
        others = np.delete(X, i, axis=1)
        explained = sm.WLS(X[:, i], others, weights=risk * (1 - risk)).fit().rsquared
        assert found[i] == pytest.approx(1 / (1 - explained), rel=1e-6)


def test_result_of_a_calm_model() -> None:
    frame = birth_weights()
    result = collinearity.check(fitted("smoke + race + age", frame, frame["low"] == 1, ["smoke"]))
    assert result.verdict == "fine"
    assert not result.findings
    factor = result.statistics["exposure_standard_error_factor"]
    assert factor is not None
    assert 1.0 < factor < 1.5
    assert f"{factor:.2f} times" in result.line
    assert len(result.tables[0].rows) == 3


def nearly_equal(exposed_to: str) -> pd.DataFrame:
    rng = np.random.default_rng(8)
    x = rng.normal(size=400)
    frame = pd.DataFrame({"x": x, "twin": x + 0.05 * rng.normal(size=400), "other": rng.normal(size=400)})
    frame["y"] = rng.random(400) < 1 / (1 + np.exp(-frame[exposed_to]))
    return frame


def test_an_exposure_with_a_twin_is_a_caution() -> None:
    frame = nearly_equal("x")
    result = collinearity.check(fitted("x + twin + other", frame[["x", "twin", "other"]], frame["y"], ["x"]))
    assert result.verdict == "caution"
    assert [finding.code for finding in result.findings] == ["collinearity-exposure"]
    assert result.statistics["exposure_standard_error_factor"] > 10


def test_twins_among_the_adjustment_do_not_matter() -> None:
    frame = nearly_equal("other")
    result = collinearity.check(fitted("other + x + twin", frame[["x", "twin", "other"]], frame["y"], ["other"]))
    assert result.verdict == "fine"
    assert [(finding.severity, finding.code) for finding in result.findings] == [("note", "collinearity-adjustment")]
    assert "X and Twin can hardly be told apart" in result.line
    assert "not the exposure's" in result.line


def test_powers_of_a_calendar_year_are_one_part() -> None:
    rng = np.random.default_rng(3)
    year = rng.integers(1990, 2020, 600).astype(float)
    smoke = pd.Categorical(np.where(rng.random(600) < 0.4, "yes", "no"), ["no", "yes"])
    frame = pd.DataFrame({"year": year, "smoke": smoke})
    model = fitted("smoke + year + I(year**2) + I(year**3)", frame, rng.random(600) < 0.3, ["smoke"])
    parts = collinearity.inflation_by_part(model)
    assert [(part.label, len(part.positions)) for part in parts] == [("Smoke", 1), ("Year", 3)]
    # Two parts inflate each other alike; and the powers are the same space as those of the year since 2005
    since = fitted(
        "smoke + year + I(year**2) + I(year**3)",
        frame.assign(year=(year - 2005) / 10),
        model.held.event,
        ["smoke"],
    )
    expected = by_determinants(since.fit.covariance[1:, 1:], [0])
    assert parts[0].inflation == pytest.approx(expected, rel=1e-6)
    assert parts[1].inflation == pytest.approx(expected, rel=1e-6)


def test_an_interaction_joins_its_columns() -> None:
    frame = birth_weights()
    model = fitted("smoke * race + age", frame, frame["low"] == 1, ["smoke"])
    labels = [(part.label, part.exposure) for part in collinearity.inflation_by_part(model)]
    assert labels == [("Smoke and Race", True), ("Age", False)]


def test_one_part_alone_has_nothing_to_overlap_with() -> None:
    frame = birth_weights()
    result = collinearity.check(fitted("smoke", frame, frame["low"] == 1, ["smoke"]))
    assert result.verdict == "not applicable"
    assert result.statistics["largest_standard_error_factor"] is None
    assert result.reasons["largest_standard_error_factor"] == result.line


def test_without_an_intercept_the_constant_counts_for_nothing() -> None:
    # The same model with and without the intercept: indicators of all levels hold the constant.
    frame = birth_weights()
    with_it = collinearity.inflation_by_part(fitted("smoke + age + lwt", frame, frame["low"], ["smoke"]))
    without = collinearity.inflation_by_part(fitted("0 + smoke + age + lwt", frame, frame["low"], ["smoke"]))
    assert {one.label: one.widening for one in without} == pytest.approx({one.label: one.widening for one in with_it})
