"""Profile limits against published values, refits by statsmodels and 50-digit arithmetic."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.optimize import brentq
from scipy.stats import chi2

from oddsmodel.inference import maximise, profile, profile_intervals
from oddsmodel.inference.profile_search import search_limit
from oddsmodel.likelihood import BinomialLikelihood

sys.path.insert(0, str(Path(__file__).parent))
from exact import KINDS, calendar, exact_fit, exact_limit


def budworm() -> BinomialLikelihood:
    dose = np.tile(np.arange(6.0), 2)
    male = np.repeat([1.0, 0.0], 6)
    dead = np.array([1, 4, 9, 13, 18, 20, 0, 2, 6, 10, 12, 16], dtype=float)
    return BinomialLikelihood(np.column_stack([1 - male, male, dose]), dead, trials=np.full(12, 20.0))


def test_tobacco_budworm() -> None:
    # Collett 1991; Venables & Ripley 2002, section 7.2 (published checks, row 9): their limits are interpolated
    fit = maximise(budworm())
    lower, upper = profile_intervals(fit)
    assert fit.coefficients == pytest.approx([-3.473, -2.372, 1.0642], abs=6e-4)
    assert lower == pytest.approx([-4.4582, -3.1729, 0.8229], abs=3e-4)
    assert upper == pytest.approx([-2.6138, -1.6552, 1.3390], abs=3e-4)


def test_against_refits_with_an_offset_by_statsmodels() -> None:
    data = sm.datasets.spector.load_pandas()
    X, y = np.column_stack([np.ones(32), data.exog]), np.asarray(data.endog, dtype=float)
    fit = maximise(BinomialLikelihood(X, y))
    lower, upper = profile_intervals(fit, level=0.9)
    height = fit.log_likelihood - chi2.ppf(0.9, 1) / 2
    for j in range(4):
        others = np.delete(X, j, axis=1)

        def above(theta: float, j: int = j, others: np.ndarray = others) -> float:
            return sm.GLM(y, others, family=sm.families.Binomial(), offset=theta * X[:, j]).fit(tol=1e-12).llf - height

        for limit, far in ((lower[j], -8), (upper[j], 8)):
            end = fit.coefficients[j] + far * fit.standard_errors[j]
            assert limit == pytest.approx(brentq(above, fit.coefficients[j], end, xtol=1e-10), abs=1e-6)


@pytest.mark.parametrize("kind", [k for k in KINDS if k != "nearly constant column"])
def test_against_fifty_digits(kind: str) -> None:
    X, y = calendar(kind, 60)
    fit = maximise(BinomialLikelihood(X, y))
    truth = exact_fit(X, y, np.ones(60), fit.coefficients)
    lower, upper = profile_intervals(fit)
    j = X.shape[1] - 1
    for limit, sign in ((lower[j], -1), (upper[j], 1)):
        start = fit.coefficients + sign * 1.96 * fit.covariance[:, j] / fit.standard_errors[j]
        exact = exact_limit(X, y, np.ones(60), truth, j, start, chi2.ppf(0.95, 1))
        assert float((limit - exact) / truth[1][j]) == pytest.approx(0.0, abs=1e-8)


def test_contrasts_of_two_coefficients() -> None:
    # the difference of the sexes' intercepts, against the model coded with an intercept and sex
    fit = maximise(budworm())
    limits = profile(fit, np.array([[-1.0, 1.0, 0.0]]))
    recoded = budworm()
    X = recoded.rows_apart()[0]
    other = maximise(recoded.transformed(np.array([[1.0, 0, 0], [1.0, 1, 0], [0, 0, 1.0]])))
    assert X.shape == (12, 3)
    lower, upper = profile_intervals(other)
    assert [limits.lower[0], limits.upper[0]] == pytest.approx([lower[1], upper[1]], abs=1e-9)


def test_the_search_by_refitting_agrees_with_the_steps() -> None:
    fit = maximise(budworm())
    _, upper = profile_intervals(fit)
    height = fit.log_likelihood - chi2.ppf(0.95, 1) / 2
    theta, status = search_limit(fit, np.eye(3)[2], 1.0, height, 2 * fit.standard_errors[2])
    assert status == "found"
    assert theta == pytest.approx(upper[2], abs=1e-9)


def test_sparse_tables_with_strong_effects() -> None:
    # cells of one and two events: quadratic steps start far off; checked by refitting on the slice
    rng = np.random.default_rng(21)
    for _ in range(40):
        trials = rng.integers(3, 40, 4).astype(float)
        events = np.minimum(rng.integers(1, 3, 4), trials - 1).astype(float)
        X = np.array([[1, 0, 0], [1, 1, 0], [1, 0, 1], [1, 1, 1]], dtype=float)
        fit = maximise(BinomialLikelihood(X, events, trials=trials))
        limits = profile(fit, np.eye(3), 0.95)
        assert set(limits.lower_status) | set(limits.upper_status) == {"found"}
        for j in range(3):
            for limit in (limits.lower[j], limits.upper[j]):
                slice_fit = maximise(fit.likelihood, basis=np.delete(np.eye(3), j, axis=1), origin=limit * np.eye(3)[j])
                drop = 2 * (fit.log_likelihood - slice_fit.log_likelihood)
                assert drop == pytest.approx(chi2.ppf(0.95, 1), abs=1e-7)
        assert (limits.lower < fit.coefficients).all()
        assert (limits.upper > fit.coefficients).all()


def test_needs_a_converged_fit() -> None:
    X = np.array([[1.0, 0.0], [1.0, 1.0]])
    fit = maximise(BinomialLikelihood(X, [0.0, 5.0], trials=[5.0, 5.0]))
    with pytest.raises(ValueError, match="converged"):
        profile(fit, np.eye(2))
