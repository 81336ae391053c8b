"""Profile limits of many rows: how few passes they take, and that these give every digit."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from scipy.stats import chi2

from oddsmodel.inference import Fit, maximise, profile, profile_intervals
from oddsmodel.inference.profile_surface import THIN_FROM, WholeSurface, thin_surface, whitening_root
from oddsmodel.likelihood import BinomialLikelihood


def records(n: int, kind: str) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(11)
    numbers = rng.normal(size=(n, 3))
    levels = rng.choice(4, n, p=[0.6, 0.3, 0.09, 0.01])
    X = np.column_stack([np.ones(n), numbers, *[levels == one for one in (1, 2, 3)]]).astype(float)
    if kind == "skewed":
        X[:, 1:4] = np.exp(numbers) - 1.0
    risk = 1 / (1 + np.exp(-(X @ np.array([-2.5, 0.3, -0.2, 0.1, 0.2, 0.5, -0.4]))))
    y = (rng.random(n) < risk).astype(float)
    if kind == "sorted":
        order = np.lexsort((y, X[:, 1]))
        X, y = X[order], y[order]
    return X, y


class Recording:
    """A likelihood that keeps what it is asked."""

    def __init__(self, likelihood: BinomialLikelihood) -> None:
        self.likelihood, self.asked = likelihood, list[tuple[int, bool]]()

    def __getattr__(self, name: str) -> Any:
        return getattr(self.likelihood, name)

    def evaluate(self, beta: np.ndarray, *, information: bool = True) -> Any:
        self.asked.append((len(beta), information))
        return self.likelihood.evaluate(beta, information=information)


def recorded(fit: Fit) -> tuple[Fit, Recording]:
    recording = Recording(fit.space.working)  # type: ignore[arg-type]
    return replace(fit, space=replace(fit.space, working=recording)), recording  # type: ignore[arg-type]


def by_newton(X: np.ndarray, y: np.ndarray, fit: Fit, j: int, sign: float, quantile: float) -> float:
    """The root of l = l_max - q/2 with all scores but that of j zero (Venzon & Moolgavkar 1988, equations 2 to 4),
    by Newton's method with the full matrix of derivatives at each point; written apart from the package."""

    def values(beta: np.ndarray) -> tuple[float, np.ndarray, np.ndarray]:
        eta = X @ beta
        risk = 1 / (1 + np.exp(-eta))
        value = -np.logaddexp(0.0, np.where(y > 0, -eta, eta)).sum()
        return value, X.T @ (y - risk), (X * (risk * (1 - risk))[:, None]).T @ X

    height = values(fit.coefficients)[0] - quantile / 2
    beta = fit.coefficients + sign * np.sqrt(quantile) * fit.covariance[:, j] / fit.standard_errors[j]
    for _ in range(6):
        value, score, information = values(beta)
        matrix, right = -information, -score
        matrix[j], right[j] = score, height - value
        beta = beta + np.linalg.solve(matrix, right)
    return float(beta[j])


@pytest.mark.parametrize("kind", ["plain", "skewed", "sorted"])
def test_every_digit_from_few_passes(kind: str) -> None:
    X, y = records(THIN_FROM + 5_000, kind)
    fit, recording = recorded(maximise(BinomialLikelihood(X, y)))
    lower, upper = profile_intervals(fit)
    for j in range(X.shape[1]):
        for limit, sign in ((lower[j], -1.0), (upper[j], 1.0)):
            # the log-likelihood is near -20,000, whose last digit is worth 2e-12 standard errors
            exact = by_newton(X, y, fit, j, sign, chi2.ppf(0.95, 1))
            assert (limit - exact) / fit.standard_errors[j] == pytest.approx(0.0, abs=2e-11)
    if kind == "plain":
        assert not any(information for _, information in recording.asked)
        assert len(recording.asked) <= 3


def test_fewer_rows_take_one_information_for_two_bounds() -> None:
    X, y = records(20_000, "plain")
    fit, recording = recorded(maximise(BinomialLikelihood(X[:, :4], y)))
    profile_intervals(fit)
    assert sum(vectors for vectors, information in recording.asked if information) == 4
    assert len(recording.asked) <= 5


def test_a_part_that_is_unlike_the_whole_is_not_used() -> None:
    # in the leaves that are looked at, the first, tenth and nineteenth, the column hardly varies
    n = 20 * 4096
    rng = np.random.default_rng(2)
    X = np.column_stack([np.ones(n), rng.normal(size=n)])
    trials = np.ones(n)
    X[:, 1] *= np.where(np.arange(n) // 4096 % 9 == 0, 0.01, 1.0)
    events = (rng.random(n) < 0.2).astype(float)
    fit = maximise(BinomialLikelihood(X, events, trials))
    root = whitening_root(fit.working_information)
    assert thin_surface(fit, root) is None
    limits = profile(fit, np.eye(2))
    height = fit.log_likelihood - chi2.ppf(0.95, 1) / 2
    for j in range(2):
        for limit in (limits.lower[j], limits.upper[j]):
            other = maximise(fit.likelihood, basis=np.eye(2)[:, [1 - j]], origin=limit * np.eye(2)[j])
            assert other.log_likelihood == pytest.approx(height, abs=1e-8)


def test_the_surface_of_a_part_is_that_of_the_whole_nearby() -> None:
    X, y = records(THIN_FROM, "plain")
    fit = maximise(BinomialLikelihood(X, y))
    root = whitening_root(fit.working_information)
    assert root.T @ fit.working_information @ root == pytest.approx(np.eye(7), abs=1e-12)
    thin, whole = thin_surface(fit, root), WholeSurface(fit.space.working, fit.working, root)
    assert thin is not None
    u = np.vstack([np.zeros(7), np.eye(7) * 2.0])
    one, other = thin.evaluate(u, information=True), whole.evaluate(u, information=True)
    assert one.log_likelihood[0] == pytest.approx(fit.log_likelihood, abs=1e-9)
    # a fifth of the rows, at a distance where the whole departs from its quadratic approximation by up to a third
    assert one.log_likelihood == pytest.approx(other.log_likelihood, abs=0.05)
    assert one.score == pytest.approx(other.score, abs=0.1)
    assert one.information == pytest.approx(other.information, abs=0.1)


def test_a_singular_information_leaves_its_null_space_out() -> None:
    information = np.array([[2.0, 2.0, 0.0], [2.0, 2.0, 0.0], [0.0, 0.0, 1e-12]])
    root = whitening_root(information)
    assert root.shape == (3, 2)
    assert root.T @ information @ root == pytest.approx(np.eye(2), abs=1e-10)
