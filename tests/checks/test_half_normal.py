"""The half-normal plot against refits by statsmodels, what it finds, and its conditions."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.integrate import quad
from scipy.special import expit
from scipy.stats import beta, norm

from oddsmodel.checks import half_normal as half_normal_module
from oddsmodel.checks.half_normal import check, expected_order, extreme
from oddsmodel.model.fitted import FittedModel
from oddsmodel.randomness import generator

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated
from grouped_models import grouped


def patterns(spread: float = 0.0, seed: int = 1) -> FittedModel:
    """Sixty patterns of twelve records, whose log odds vary by `spread` beside the model."""
    rng = np.random.default_rng(seed)
    X = np.column_stack([np.ones(60), rng.normal(size=60), np.tile([0.0, 1.0], 30)])
    events = rng.binomial(12, expit(X @ [-0.5, 0.7, 0.5] + spread * rng.normal(size=60)))
    return grouped_model(X, events, np.full(60, 12))


@pytest.mark.parametrize(("number", "off"), [(9, 0.05), (40, 0.012)])
def test_expected_order_statistics_are_near_those_of_the_half_normal_distribution(number: int, off: float) -> None:
    """Against means by numerical integration of the order statistics of |Z| of so many values."""
    for rank, found in enumerate(expected_order(number), start=1):
        density = beta(rank, number + 1 - rank).pdf
        mean, _ = quad(lambda u, density=density: norm.ppf((1 + u) / 2) * density(u), 0, 1)
        assert found == pytest.approx(mean, abs=off)


def test_envelope_is_that_of_refits_by_statsmodels() -> None:
    model = patterns()
    figure = check(model).figures[0]
    X = np.asarray(model.rows.passes.taken(range(60))["X"])
    events = np.asarray(model.rows.passes.taken(range(60))["events"])

    def ordered(y: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        fit = sm.GLM(np.column_stack([y, 12 - y]), X, family=sm.families.Binomial()).fit(tol=1e-13)
        return np.sort(np.abs(fit.resid_deviance)), fit.fittedvalues

    observed, risk = ordered(events)
    drawn = [generator(model.seed, "half-normal plot", "main", k).binomial(np.full(60, 12), risk) for k in range(39)]
    curves = np.stack([ordered(y)[0] for y in drawn])
    # the ten smallest are gathered in runs of one: every residual is a point of its own
    assert figure.observed == pytest.approx(observed, abs=1e-5)
    assert figure.lower == pytest.approx(curves.min(axis=0), abs=1e-5)
    assert figure.upper == pytest.approx(curves.max(axis=0), abs=1e-5)
    assert figure.middle == pytest.approx(curves.mean(axis=0), abs=1e-5)
    assert sum(figure.records) == 720
    together = np.vstack([observed, curves])
    distance = np.abs(together - together.mean(axis=0)) / together.std(axis=0)
    p = (distance.max(axis=1) >= distance[0].max()).mean()
    assert check(model).statistics["p"] == pytest.approx(p)


def test_the_farthest_curve_is_found() -> None:
    curves = np.array([[1.0, 5.0, 1.0], [1.1, 2.0, 1.0], [0.9, 2.1, 1.0], [1.0, 1.9, 1.0]])
    distance, place = extreme(curves)
    assert distance.argmax() == 0
    assert place == 1
    # no spread, no distance
    assert extreme(np.ones((4, 3)))[0].tolist() == [0.0] * 4


def test_a_right_model_stays_within_and_a_spread_is_found() -> None:
    right = check(patterns())
    assert right.verdict == "fine"
    assert "stay among those" in right.line
    wrong = check(patterns(spread=1.0))
    assert wrong.verdict == "look"
    assert wrong.statistics["p"] == pytest.approx(1 / 40)
    assert wrong.statistics["share_outside"] > 0.3
    assert "by being larger" in wrong.line
    assert wrong.findings[0].severity == "note"


def test_many_residuals_are_gathered_but_for_the_largest() -> None:
    result = check(record_model(*simulated(1200, [-0.5, 0.8])))
    figure = result.figures[0]
    assert len(figure.x) == 150
    assert sum(figure.values) == sum(figure.records) == 1200
    assert figure.values[-50:] == (1,) * 50
    assert list(figure.observed) == sorted(figure.observed)
    assert all(low <= middle <= up for low, middle, up in zip(figure.lower, figure.middle, figure.upper, strict=True))


def test_the_same_seed_gives_the_same_plot_and_another_seed_another() -> None:
    model = patterns()
    assert check(model) == check(model)
    assert check(replace(model, seed=7)).figures != check(model).figures


def test_conditions() -> None:
    for model, words in (
        (grouped(), "independent"),
        (record_model(*simulated(300, [0.0, 0.5]), design="matched case-control"), "compared within themselves"),
        (grouped_model([[1, 0], [1, 1], [1, 2]], [5, 8, 9], [20, 20, 20]), "no order can be seen"),
        (record_model(*simulated(10_001, [0.0, 0.5])), "would have to be fitted"),
    ):
        result = check(model)
        assert result.verdict == "not applicable"
        assert words in result.line
        assert set(result.reasons) == set(result.statistics)
        assert result.figures == ()


def test_simulated_outcomes_that_separate_are_left_out(monkeypatch: pytest.MonkeyPatch) -> None:
    rng = np.random.default_rng(4)
    x = np.sort(rng.normal(size=24))
    y = (np.arange(24) > 11).astype(float)
    y[[10, 13]] = 1 - y[[10, 13]]
    model = record_model(np.column_stack([np.ones(24), x]), y)
    result = check(model)
    assert result.statistics["simulations"] is None or result.statistics["simulations"] < 39
    monkeypatch.setattr(half_normal_module, "FEWEST_FITS", 39)
    assert "separated" in check(model).line
