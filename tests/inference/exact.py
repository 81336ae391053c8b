"""Maximum likelihood and profile limits in 50-digit arithmetic, for the tests only."""

from __future__ import annotations

from typing import Any

import mpmath
import numpy as np

DIGITS = 50


def _pieces(X: Any, events: Any, trials: Any, beta: Any) -> tuple[Any, Any, Any]:
    n, p = X.shape
    value, score, information = mpmath.mpf(0), mpmath.zeros(p, 1), mpmath.zeros(p, p)
    for i in range(n):
        row = [mpmath.mpf(float(x)) for x in X[i]]
        linear = mpmath.fsum(row[j] * beta[j] for j in range(p))
        risk = 1 / (1 + mpmath.exp(-linear))
        y, m = mpmath.mpf(float(events[i])), mpmath.mpf(float(trials[i]))
        value += y * linear - m * mpmath.log(1 + mpmath.exp(linear))
        for j in range(p):
            score[j] += row[j] * (y - m * risk)
            for k in range(j + 1):
                information[j, k] += m * risk * (1 - risk) * row[j] * row[k]
    for j in range(p):
        for k in range(j):
            information[k, j] = information[j, k]
    return value, score, information


def exact_fit(X: Any, events: Any, trials: Any, start: Any) -> tuple[Any, Any, Any]:
    """Coefficients, standard errors and log-likelihood (mpmath numbers), by Newton from a start nearby."""
    with mpmath.workdps(DIGITS):
        p = X.shape[1]
        beta = mpmath.matrix([mpmath.mpf(float(b)) for b in start])
        for _ in range(50):
            _, score, information = _pieces(X, events, trials, beta)
            step = mpmath.lu_solve(information, score)
            beta += step
            if mpmath.norm(step) < mpmath.mpf(10) ** -40 * (1 + mpmath.norm(beta)):
                break
        value, _, information = _pieces(X, events, trials, beta)
        inverse = information**-1
        return beta, [mpmath.sqrt(inverse[j, j]) for j in range(p)], value


def exact_limit(X: Any, events: Any, trials: Any, fit: Any, j: int, start: Any, quantile: Any) -> Any:
    """Profile limit of coefficient j: the root of l(beta) = l_max - q/2 with the other scores zero, from a start."""
    with mpmath.workdps(DIGITS):
        p = X.shape[1]
        height = fit[2] - mpmath.mpf(quantile) / 2
        beta = mpmath.matrix([mpmath.mpf(float(b)) for b in start])
        for _ in range(50):
            value, score, information = _pieces(X, events, trials, beta)
            matrix, right = -information, -score
            for k in range(p):
                matrix[j, k] = score[k]
            right[j] = height - value
            step = mpmath.lu_solve(matrix, right)
            beta += step
            if mpmath.norm(step) < mpmath.mpf(10) ** -40 * (1 + mpmath.norm(beta)):
                break
        return beta[j]


def correct_digits(number: float, truth: Any, standard_error: Any) -> float:
    """Correct significant digits of a number relative to max(|truth|, standard error), at most 20."""
    with mpmath.workdps(DIGITS):
        off = abs(truth - mpmath.mpf(float(number))) / max(abs(truth), standard_error)
        return float(-mpmath.log10(max(off, mpmath.mpf(10) ** -20)))


def calendar(kind: str, n: int = 120) -> tuple[np.ndarray, np.ndarray]:
    """Well and badly conditioned matrices around raw calendar years, with outcomes from a known curve."""
    rng = np.random.default_rng(3)
    year = rng.integers(1990, 2021, n).astype(float)
    columns = {
        "standard normal columns": lambda: [np.ones(n), *rng.normal(size=(3, n))],
        "year": lambda: [np.ones(n), year],
        "year and its square": lambda: [np.ones(n), year, year**2, rng.random(n) < 0.3],
        "year, square and cube": lambda: [np.ones(n), year, year**2, year**3],
        "no intercept, year and square": lambda: [year, year**2],
        "nearly constant column": lambda: [np.ones(n), 1.0 + 1e-6 * rng.normal(size=n), 1e9 * rng.normal(size=n)],
    }[kind]()
    centred = (year - 2005) / 10
    risk = 1 / (1 + np.exp(-(-0.3 + 0.5 * centred - 0.3 * centred**2)))
    return np.column_stack(columns).astype(float), (rng.random(n) < risk).astype(float)


KINDS = (
    "standard normal columns",
    "year",
    "year and its square",
    "year, square and cube",
    "no intercept, year and square",
    "nearly constant column",
)
