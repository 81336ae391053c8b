"""Condition indices and variance proportions against numpy's singular values of the weighted matrix itself."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from oddsmodel.checks import condition_indices
from oddsmodel.checks.condition_indices import conditions, weighted_root

sys.path.insert(0, str(Path(__file__).parent))
from asked_form import columns_of
from form_models import birth_weights, fitted


def belsley(X: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Belsley, Kuh & Welsch 1980, section 3.2, from the columns themselves: indices falling, shares by coefficient."""
    _, d, vt = np.linalg.svd(X / np.linalg.norm(X, axis=0), full_matrices=False)
    phi = (vt.T / d) ** 2
    return (d[0] / d)[::-1], (phi / phi.sum(axis=1, keepdims=True)).T[::-1]


def weighted(model: object, frame: pd.DataFrame) -> np.ndarray:
    X = columns_of(model, frame)
    mu = 1 / (1 + np.exp(-X @ model.fit.coefficients))
    return X * np.sqrt(mu * (1 - mu))[:, None]


def test_against_numpy_with_the_constant_and_without() -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"])
    W = weighted(model, frame)
    result = condition_indices.check(model)
    indices, shares = belsley(W)
    assert result.statistics["largest_index"] == pytest.approx(indices[0], rel=1e-8)
    table = np.array([row[1:] for row in result.tables[0].rows], dtype=float)
    assert table == pytest.approx(shares[:4].T, abs=1e-8)
    constant = next(i for i, column in enumerate(model.design.columns) if column.kind == "intercept")
    one = W[:, constant] / np.linalg.norm(W[:, constant])
    rest = np.delete(W, constant, axis=1)
    indices, shares = belsley(rest - np.outer(one, one @ rest))
    assert result.statistics["largest_index_without_constant"] == pytest.approx(indices[0], rel=1e-8)
    table = np.array([row[1:] for row in result.tables[1].rows], dtype=float)
    assert table == pytest.approx(shares[:4].T, abs=1e-8)
    assert result.verdict == "fine"


def test_shares_of_a_coefficient_add_up_to_one() -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt", frame, frame["low"] == 1, ["smoke"])
    found = conditions(weighted_root(model), (0, 1, 2, 3))
    assert found is not None
    assert found.proportions.sum(axis=0) == pytest.approx(1.0)
    assert (np.diff(found.indices) <= 0).all()
    assert found.indices[-1] == pytest.approx(1.0)


def tied(of_exposure: bool) -> condition_indices.CheckResult:
    rng = np.random.default_rng(12)
    n = 2000
    one, other = rng.normal(size=n), rng.normal(size=n)
    frame = pd.DataFrame({"one": one, "copy": one + 0.01 * rng.normal(size=n), "other": other})
    model = fitted("one + copy + other", frame, rng.random(n) < 0.4, ["one" if of_exposure else "other"])
    return condition_indices.check(model)


def test_a_strong_dependency_is_told_and_whose_it_is() -> None:
    result = tied(of_exposure=True)
    assert result.verdict == "look"
    assert "One, per 1 unit and Copy, per 1 unit" in result.explanation
    assert result.statistics["largest_index_without_constant"] > 100
    apart = tied(of_exposure=False)
    assert apart.verdict == "fine"
    assert "The exposure is not among them" in apart.explanation


def test_years_are_bound_to_the_constant_only() -> None:
    rng = np.random.default_rng(4)
    year = rng.integers(1990, 2021, 900).astype(float)
    frame = pd.DataFrame({"a": pd.Categorical(rng.choice(["no", "yes"], 900), ["no", "yes"]), "year": year})
    result = condition_indices.check(fitted("a + year", frame, rng.random(900) < 0.4, ["a"]))
    assert result.statistics["largest_index"] > 100
    assert result.statistics["largest_index_without_constant"] < 3
    assert "No strong dependency" in result.explanation


def test_raw_powers_of_a_year_are_exact() -> None:
    from mpmath import mp, mpf, svd_r

    rng = np.random.default_rng(4)
    year = rng.integers(1990, 2021, 600).astype(float)
    frame = pd.DataFrame({"year": year})
    model = fitted("year + I(year**2)", frame, rng.random(600) < 0.4, ["year"])
    assert model.fit.space.to_beta is not None
    mp.dps = 40
    years = np.arange(1990, 2021)
    count = np.array([(year == one).sum() for one in years])
    away = columns_of(model, pd.DataFrame({"year": years.astype(float)}))
    eta = [sum(mpf(float(b)) * mpf(float(x)) for b, x in zip(model.fit.coefficients, row, strict=True)) for row in away]
    weight = [mpf(int(n)) * mp.e**e / (1 + mp.e**e) ** 2 for n, e in zip(count, eta, strict=True)]
    rows = [[mp.sqrt(w) * mpf(int(t)) ** k for k in range(3)] for w, t in zip(weight, years, strict=True)]
    length = [mp.sqrt(sum(row[k] ** 2 for row in rows)) for k in range(3)]
    singular = svd_r(mp.matrix([[row[k] / length[k] for k in range(3)] for row in rows]), compute_uv=False)
    result = condition_indices.check(model)
    assert result.statistics["largest_index"] == pytest.approx(float(singular[0] / singular[2]), rel=1e-4)


def test_without_a_constant_and_levels_in_its_place() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    bare = condition_indices.check(fitted("age + lwt - 1", frame, low, ["age"]))
    assert bare.statistics["largest_index_without_constant"] is None
    assert "no constant" in bare.reasons["largest_index_without_constant"]
    levels = condition_indices.check(fitted("race + age - 1", frame, low, ["race"]))
    assert len(levels.tables[1].rows) == 3
    assert levels.statistics["largest_index_without_constant"] < 10
