"""Ratios of the engine against statsmodels and scikit-learn, side by side in one process.

Run: python tests/benchmarks/engine.py [records]     (a million records by default; about a minute)
"""

from __future__ import annotations

import statistics
import sys
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import statsmodels.api as sm
from sklearn.linear_model import LogisticRegression

from oddsmodel.inference import certify, maximise, profile_intervals
from oddsmodel.likelihood import BinomialLikelihood

RUNS = 3


def mixed(records: int) -> tuple[np.ndarray, np.ndarray]:
    """An intercept, eight numbers and eight indicators."""
    rng = np.random.default_rng(1)
    numbers, indicators = rng.normal(size=(records, 8)), rng.random((records, 8)) < 0.3
    X = np.column_stack([np.ones(records), numbers, indicators]).astype(float)
    beta = rng.normal(size=17) * 0.2
    beta[0] = -1.0
    return X, (rng.random(records) < 1 / (1 + np.exp(-X @ beta))).astype(float)


def seconds(work: Callable[[], Any]) -> tuple[float, Any]:
    """Median time of several runs, and the last answer."""
    times, answer = [], None
    for _ in range(RUNS):
        start = time.perf_counter()
        answer = work()
        times.append(time.perf_counter() - start)
    return statistics.median(times), answer


def main() -> None:
    records = int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000
    X, y = mixed(records)
    ours, fit = seconds(lambda: maximise(BinomialLikelihood(X, y)))
    limits, _ = seconds(lambda: profile_intervals(fit))
    certificate, _ = seconds(lambda: certify(fit))
    logit, reference = seconds(lambda: sm.Logit(y, X).fit(disp=0, tol=1e-10))
    newton, other = seconds(
        lambda: LogisticRegression(C=np.inf, solver="newton-cholesky", fit_intercept=False, tol=1e-8).fit(X, y)
    )
    print(f"{records:,} records, 17 columns, medians of {RUNS} runs")
    for name, value in (
        ("our fit", ours),
        ("our profile limits, all 34", limits),
        ("our certificate", certificate),
        ("statsmodels Logit, fit", logit),
        ("scikit-learn newton-cholesky, fit", newton),
    ):
        print(f"  {name:36s}{value:8.3f} s   {value / ours:6.2f} of our fit")
    print(f"  largest difference from statsmodels  {np.abs(fit.coefficients - reference.params).max():.1e}")
    print(f"  largest difference from scikit-learn {np.abs(fit.coefficients - other.coef_[0]).max():.1e}")


if __name__ == "__main__":
    main()
