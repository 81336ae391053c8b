"""The joint test of products against statsmodels."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import scipy.stats
import statsmodels.api as sm

from oddsmodel.checks import interactions
from oddsmodel.checks.products import product_pairs

sys.path.insert(0, str(Path(__file__).parent))
from asked_form import columns_of, log_likelihood
from form_models import birth_weights, fitted
from form_on_disk import on_disk, single_rows, ward_model


def all_products(X: np.ndarray, pairs: tuple[tuple[int, int], ...]) -> np.ndarray:
    return np.column_stack([X[:, i] * X[:, j] for i, j in pairs])


@pytest.mark.parametrize("formula", ["smoke + age + lwt + race", "race + age + smoke + ht - 1"])
def test_likelihood_ratio_against_statsmodels(formula: str) -> None:
    frame = birth_weights()
    model = fitted(formula, frame, frame["low"] == 1, ["smoke"])
    X, y = columns_of(model, frame), frame["low"].to_numpy()
    pairs = product_pairs(model)
    wide = np.column_stack([X, all_products(X, pairs)])
    rank = np.linalg.matrix_rank(wide)
    statistic = 2 * (log_likelihood(y, wide[:, independent(wide)]) - model.fit.log_likelihood)
    result = interactions.check(model)
    assert result.statistics["products"] == len(pairs)
    assert result.statistics["df"] == rank - X.shape[1]
    assert result.statistics["aliased"] == len(pairs) - (rank - X.shape[1])
    assert result.statistics["statistic"] == pytest.approx(statistic, abs=1e-6)
    assert result.statistics["p"] == pytest.approx(scipy.stats.chi2.sf(statistic, rank - X.shape[1]), abs=1e-7)


def independent(X: np.ndarray) -> list[int]:
    kept: list[int] = []
    for column in range(X.shape[1]):
        if np.linalg.matrix_rank(X[:, [*kept, column]]) == len(kept) + 1:
            kept.append(column)
    return kept


def test_score_test_is_raos(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(interactions, "MOST_FITTED", 0)
    frame = birth_weights()
    model = fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"])
    X, y = columns_of(model, frame), frame["low"].to_numpy()
    fit = sm.Logit(y, X).fit(disp=0, tol=1e-13)
    wide = np.column_stack([X, all_products(X, product_pairs(model))])
    mu = fit.predict()
    score = wide.T @ (y - mu)
    information = (wide * (mu * (1 - mu))[:, None]).T @ wide
    result = interactions.check(model)
    assert result.statistics["statistic"] == pytest.approx(score @ np.linalg.solve(information, score), rel=1e-6)
    assert result.tables[0].rows[0][0] == "Rao's score"
    assert "needs no fit" in result.explanation


def test_products_that_add_nothing_are_counted() -> None:
    rng = np.random.default_rng(3)
    n = 1200
    a = rng.choice(["no", "yes"], n)
    # the third site has no one exposed, so that its product is zero throughout
    site = np.where((a == "yes"), rng.choice(["one", "two"], n), rng.choice(["one", "two", "three"], n))
    frame = pd.DataFrame(
        {
            "a": pd.Categorical(a, ["no", "yes"]),
            "site": pd.Categorical(site, ["one", "two", "three"]),
            "x": rng.normal(size=n),
        }
    )
    event = rng.random(n) < 0.4
    result = interactions.check(fitted("a + site + x", frame, event, ["a"]))
    assert [result.statistics[key] for key in ("products", "aliased", "df")] == [3, 1, 2]
    assert "levels that never meet" in result.explanation
    had = interactions.check(fitted("a * x + site", frame, event, ["a"]))
    assert [had.statistics[key] for key in ("products", "aliased", "df")] == [3, 2, 1]
    nothing = interactions.check(fitted("a * x", frame, event, ["a"]))
    assert nothing.verdict == "not applicable"
    assert "has already" in nothing.reasons["p"]


def test_a_true_interaction_is_seen_and_no_product_is_named() -> None:
    rng = np.random.default_rng(2)
    n = 3000
    a, x, z = rng.random(n) < 0.5, rng.normal(size=n), rng.normal(size=n)
    event = rng.random(n) < 1 / (1 + np.exp(-(-0.5 + 0.3 * a + 0.3 * x - 0.6 * a * x)))
    frame = pd.DataFrame({"a": pd.Categorical(np.where(a, "yes", "no"), ["no", "yes"]), "xenon": x, "zinc": z})
    result = interactions.check(fitted("a + xenon + zinc", frame, event, ["a"]))
    assert result.verdict == "look"
    text = f"{result.explanation} {result.tables[0]}".lower()
    assert "xenon" not in text
    assert "zinc" not in text


def test_too_few_events_no_products_and_groups() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    few = interactions.check(fitted("race + age + lwt + smoke + ht + ui + ftv", frame, low, ["race"]))
    assert few.verdict == "not applicable"
    assert "fewer than 10 events" in few.reasons["statistic"]
    assert "12 products" in few.reasons["statistic"]
    alone = interactions.check(fitted("smoke", frame, low, ["smoke"]))
    assert "no products" in alone.reasons["p"]


def test_calendar_years_beside_their_square() -> None:
    rng = np.random.default_rng(4)
    n = 1500
    year = rng.integers(1990, 2021, n).astype(float)
    frame = pd.DataFrame({"a": pd.Categorical(rng.choice(["no", "yes"], n), ["no", "yes"]), "year": year})
    event = rng.random(n) < 1 / (1 + np.exp(-(-1 + 0.003 * (year - 2005) ** 2)))
    model = fitted("a + year + I(year**2)", frame, event, ["a"])
    assert model.fit.space.to_beta is not None
    away, a = (year - 2005) / 10, (frame["a"] == "yes").to_numpy(float)
    small = np.column_stack([np.ones(n), a, away, away**2])
    full = np.column_stack([small, a * away, a * away**2])
    statistic = 2 * (log_likelihood(event, full) - log_likelihood(event, small))
    result = interactions.check(model)
    assert result.statistics["df"] == 2
    assert result.statistics["statistic"] == pytest.approx(statistic, abs=1e-5)


def test_the_same_on_disk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    monkeypatch.setattr("oddsmodel.checks.nearby.PART_LEAVES", 2)
    model = ward_model(17_000)
    assert interactions.check(on_disk(model, tmp_path / "rows")) == interactions.check(model)
