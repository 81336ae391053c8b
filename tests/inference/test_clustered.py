"""The cluster-robust covariance against statsmodels (Logit with cov_type="cluster"; GEE with independence)."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import statsmodels.api as sm

from oddsmodel.design.patterns import collapse
from oddsmodel.inference import certify, maximise
from oddsmodel.inference.clustered import clustered_covariance, small_sample_factor, within_one_group
from oddsmodel.likelihood import BinomialLikelihood


def invented(seed: int, groups: int = 50, largest: int = 9) -> tuple[Any, Any, Any]:
    """Matrix (n, 4) with few distinct rows, events (n,), group of each record (n,)."""
    rng = np.random.default_rng(seed)
    group = np.repeat(np.arange(groups), rng.integers(1, largest + 1, groups))
    n = group.size
    common = rng.normal(0.0, 0.8, groups)[group]
    X = np.column_stack([np.ones(n), rng.random(n) < 0.4, rng.integers(0, 5, n), rng.random(n) < 0.5]).astype(float)
    event = rng.random(n) < 1.0 / (1.0 + np.exp(-(X @ [-0.8, 0.6, 0.2, -0.3] + common)))
    return X, event, group


def robust(X: Any, event: Any, group: Any, counts: Any = None) -> Any:
    patterns = collapse(X, event, counts)
    fit = certify(maximise(BinomialLikelihood(patterns.X, patterns.events, trials=patterns.trials))).fit
    factor = small_sample_factor(int(np.unique(group).size), float(patterns.trials.sum()), X.shape[1])
    assert factor is not None
    return fit, clustered_covariance(
        fit, patterns.index, event, np.unique(group, return_inverse=True)[1], factor, counts
    )


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_it_is_that_of_statsmodels(seed: int) -> None:
    X, event, group = invented(seed)
    _, covariance = robust(X, event, group)
    reference = sm.Logit(event.astype(float), X).fit(
        disp=0, tol=1e-14, maxiter=100, cov_type="cluster", cov_kwds={"groups": group, "use_correction": True}
    )
    np.testing.assert_allclose(covariance, reference.cov_params(), rtol=1e-8, atol=1e-12)


def test_without_the_factor_it_is_that_of_gee_with_independence() -> None:
    """GEE's bias-free "robust" covariance of Liang & Zeger 1986 has no small-sample factor."""
    X, event, group = invented(4)
    _, covariance = robust(X, event, group)
    factor = small_sample_factor(int(np.unique(group).size), float(len(group)), X.shape[1])
    assert factor is not None
    model = sm.GEE(
        event.astype(float), X, group, family=sm.families.Binomial(), cov_struct=sm.cov_struct.Independence()
    )
    reference = model.fit(ctol=1e-13, maxiter=200)
    np.testing.assert_allclose(covariance / factor, reference.cov_params(), rtol=1e-8, atol=1e-12)


def test_with_a_record_a_group_it_is_white_s_with_the_factor() -> None:
    """(n/(n − p)) times the sandwich computed directly."""
    X, event, _ = invented(5)
    fit, covariance = robust(X, event, np.arange(len(X)))
    risk = 1.0 / (1.0 + np.exp(-X @ fit.coefficients))
    bread = np.linalg.inv(X.T @ (X * (risk * (1.0 - risk))[:, None]))
    scores = X * (event - risk)[:, None]
    expected = bread @ (scores.T @ scores) @ bread * len(X) / (len(X) - X.shape[1])
    np.testing.assert_allclose(covariance, expected, rtol=1e-10)


def test_counts_stand_for_as_many_records_of_their_group() -> None:
    X, event, group = invented(6)
    rows = np.unique(np.column_stack([group, event, X]), axis=0, return_counts=True)
    grouped, counts = rows
    _, apart = robust(X, event, group)
    _, together = robust(grouped[:, 2:], grouped[:, 1] == 1.0, grouped[:, 0].astype(int), counts.astype(float))
    np.testing.assert_allclose(together, apart, rtol=1e-10)


def test_raw_years_with_their_squares_lose_nothing() -> None:
    """Against the same columns centred by hand: the coefficient of the square is the same in both."""
    rng = np.random.default_rng(7)
    _, _, group = invented(7)
    year = rng.integers(1990, 2021, group.size).astype(float)
    event = rng.random(group.size) < 0.4
    raw = np.column_stack([np.ones(year.size), year, year**2])
    centred = np.column_stack([np.ones(year.size), year - 2005.0, (year - 2005.0) ** 2])
    one, other = robust(raw, event, group)[1], robust(centred, event, group)[1]
    assert one[2, 2] == pytest.approx(other[2, 2], rel=1e-7)


def test_the_order_of_the_records_does_not_matter() -> None:
    X, event, group = invented(8)
    order = np.random.default_rng(0).permutation(len(X))
    np.testing.assert_allclose(
        robust(X[order], event[order], group[order])[1], robust(X, event, group)[1], rtol=1e-10, atol=1e-14
    )


def test_there_is_no_factor_where_there_is_no_answer() -> None:
    assert small_sample_factor(1, 100.0, 2) is None
    assert small_sample_factor(5, 3.0, 3) is None
    assert small_sample_factor(5, 101.0, 1) == pytest.approx(1.25)


def test_a_mark_of_one_group_is_found() -> None:
    groups = np.array([0, 0, 1, 1, 2])
    assert within_one_group(groups == 1, groups)
    assert within_one_group(groups != 1, groups)
    assert within_one_group(np.array([True, False, False, False, False]), groups)
    assert not within_one_group(np.array([True, False, True, False, False]), groups)
