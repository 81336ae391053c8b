"""What is left to estimate on separated records, against direct maximisation by scipy and statsmodels."""

from __future__ import annotations

import sys
from functools import partial
from pathlib import Path

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.optimize import brentq, minimize, minimize_scalar
from scipy.stats import chi2

from oddsmodel.inference import finite_part, maximise, one_sided_limits, profile, separation
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.passes import Leaf
from oddsmodel.passes.local import LocalPasses, MemorySource

sys.path.insert(0, str(Path(__file__).parent))
from enumerated_cone import enumerated

HALF = chi2.ppf(0.95, 1) / 2


def supremum(X: np.ndarray, events: np.ndarray, trials: np.ndarray, offset: np.ndarray) -> float:
    """The supremum of the log-likelihood by a trust-region search on all rows, which runs far out to reach it."""

    def value(b: np.ndarray) -> float:
        eta = X @ b + offset
        return float(np.sum(trials * np.logaddexp(0.0, eta) - events * eta))

    def slope(b: np.ndarray) -> np.ndarray:
        return X.T @ (trials / (1 + np.exp(-(X @ b + offset))) - events)

    def curvature(b: np.ndarray) -> np.ndarray:
        risk = 1 / (1 + np.exp(-(X @ b + offset)))
        return (X.T * (trials * risk * (1 - risk))) @ X

    if X.shape[1] == 0:
        return -value(np.zeros(0))
    with np.errstate(over="ignore"):
        found = minimize(
            value, np.zeros(X.shape[1]), jac=slope, hess=curvature, method="trust-exact", options={"gtol": 1e-11}
        )
    return -float(found.fun)


def test_a_table_with_an_empty_cell() -> None:
    # 5 of 20 and 0 of 10; by hand: the reference keeps its log odds, the level falls without end
    X = np.array([[1.0, 0.0], [1.0, 1.0]])
    likelihood = BinomialLikelihood(X, [5.0, 0.0], trials=[20.0, 10.0])
    verdict = separation(X, np.array([5.0, 0.0]), np.array([20.0, 10.0]))
    part = finite_part(likelihood, verdict)
    assert part.coefficients == (pytest.approx(np.log(1 / 3), abs=1e-12), None)
    assert part.standard_errors == (pytest.approx(np.sqrt(1 / 5 + 1 / 15), abs=1e-12), None)
    assert part.covariance[0, 0] == pytest.approx(1 / 5 + 1 / 15, abs=1e-12)
    top = 5 * np.log(0.25) + 15 * np.log(0.75)
    assert part.log_likelihood == pytest.approx(top, abs=1e-10)

    def short(theta: float) -> float:
        # the profile of two binomials, over the reference's log odds
        def lost(a: float) -> float:
            return 20 * np.logaddexp(0, a) - 5 * a + 10 * np.logaddexp(0, a + theta)

        return top - HALF + float(minimize_scalar(lost, bracket=(-3, 3), tol=1e-14).fun)

    two_sided, below = one_sided_limits(likelihood, verdict, part)
    assert (two_sided.status, two_sided.limit) == ("two-sided", None)
    assert (below.kind, below.status) == ("minus infinity", "at or below")
    assert below.limit == pytest.approx(brentq(short, -8, 3, xtol=1e-12), abs=1e-8)
    # the same table from the other level: the contrast turned round
    above = one_sided_limits(likelihood, verdict, part, np.array([[0.0, -1.0]]))[0]
    assert above.status == "at or above"
    assert above.limit == pytest.approx(-below.limit, abs=1e-9)


def test_a_limit_at_another_level() -> None:
    # no events among 10: the log odds at which 10 log(1 + exp(theta)) = q/2
    X = np.ones((1, 1))
    verdict = separation(X, np.zeros(1), np.full(1, 10.0))
    likelihood = BinomialLikelihood(X, [0.0], trials=[10.0])
    part = finite_part(likelihood, verdict)
    assert (part.status, part.fit, part.log_likelihood) == ("no rows kept", None, 0.0)
    assert part.coefficients == (None,)
    for level in (0.5, 0.9, 0.99):
        limit = one_sided_limits(likelihood, verdict, part, level=level)[0].limit
        assert limit == pytest.approx(np.log(np.expm1(chi2.ppf(level, 1) / 20)), abs=1e-8)
    with pytest.raises(ValueError, match="level"):
        one_sided_limits(likelihood, verdict, part, level=1.0)


def above_the_supremum(data: tuple[np.ndarray, ...], j: int, top: float, theta: float) -> float:
    """The profile log-likelihood of coefficient j at theta, less the supremum."""
    X, events, trials, offset = data
    return supremum(np.delete(X, j, axis=1), events, trials, offset + theta * X[:, j]) - top


def test_generated_cases_against_direct_maximisation() -> None:
    rng = np.random.default_rng(21)
    seen: dict[str, int] = {}
    for case in range(70):
        p, n = int(rng.integers(1, 5)), int(rng.integers(5, 15))
        X = rng.integers(0 if case % 2 else -2, 2 if case % 2 else 3, size=(n, p)).astype(float)
        X[:, 0] = 1.0
        trials = rng.integers(1, 4, n).astype(float)
        offset = rng.normal(size=n) if case % 3 == 0 else np.zeros(n)
        events = rng.binomial(trials.astype(int), 1 / (1 + np.exp(-X @ rng.normal(size=p) * 3))).astype(float)
        if np.linalg.matrix_rank(X) < p:
            continue
        verdict = separation(X, events, trials)
        if not verdict.separated:
            continue
        likelihood = BinomialLikelihood(X, events, trials=trials, offset=offset)
        part = finite_part(likelihood, verdict)
        data = X, events, trials, offset
        top = supremum(X, events, trials, offset)
        assert part.log_likelihood == pytest.approx(top, abs=1e-6)
        limits = one_sided_limits(likelihood, verdict, part)
        for j, limit in enumerate(limits):
            seen[limit.status] = seen.get(limit.status, 0) + 1
            above = partial(above_the_supremum, data, j, top)
            if limit.limit is not None:
                assert above(limit.limit) == pytest.approx(-HALF, abs=1e-5)
                outward = 1.0 if limit.status == "at or above" else -1.0
                assert above(limit.limit + outward) > -HALF
                assert above(limit.limit - outward) < -HALF
            elif limit.status == "flat":
                assert above(-3.0) == pytest.approx(0.0, abs=1e-5)
                assert above(3.0) == pytest.approx(0.0, abs=1e-5)
            else:
                assert limit.status == "two-sided"
                estimate = part.coefficients[j]
                assert estimate is not None
                assert above(estimate) == pytest.approx(0.0, abs=1e-5)
                assert part.fit is not None
                bounds = profile(part.fit, part.within(np.eye(p)[j]))
                for bound in (bounds.lower[0], bounds.upper[0]):
                    assert above(bound) == pytest.approx(-HALF, abs=1e-5)
    assert min(seen[one] for one in ("at or above", "at or below", "flat", "two-sided")) > 12


def test_finite_coefficients_are_those_of_the_records_kept() -> None:
    # two covariates and a level without events, one of the levels identified only by separated records
    rng = np.random.default_rng(8)
    n = 400
    x, level = rng.normal(size=n), rng.integers(0, 4, n)
    X = np.column_stack([np.ones(n), x, level == 1, level == 2, level == 3, (level == 2) * x]).astype(float)
    y = (rng.random(n) < 1 / (1 + np.exp(-0.5 - x))).astype(float)
    y[level == 2] = 0.0
    likelihood = BinomialLikelihood(X, y)
    fit = maximise(likelihood)
    assert fit.status == "no finite maximum"
    assert fit.separation is not None
    part = finite_part(likelihood, fit.separation)
    assert part.finite == (0, 1, 2, 4)
    assert part.columns == (0, 1, 2, 4)
    kept = level != 2
    known = sm.GLM(y[kept], X[kept][:, [0, 1, 2, 4]], family=sm.families.Binomial()).fit(tol=1e-12)
    assert [part.coefficients[j] for j in part.finite] == pytest.approx(known.params, abs=1e-8)
    assert [part.standard_errors[j] for j in part.finite] == pytest.approx(known.bse, rel=1e-6)
    assert part.covariance == pytest.approx(np.asarray(known.cov_params()), rel=1e-5, abs=1e-9)
    assert part.log_likelihood == pytest.approx(known.llf, abs=1e-8)
    assert part.log_likelihood == pytest.approx(fit.log_likelihood, abs=1e-9)
    statuses = [one.status for one in one_sided_limits(likelihood, fit.separation, part)]
    assert statuses[:3] == ["two-sided"] * 3
    # along the records of the level, any slope serves if its intercept falls far enough
    assert statuses[3:] == ["at or below", "two-sided", "flat"]


def test_two_separated_columns_limit_each_other_no_more_than_alone() -> None:
    # levels b (no events) and c (events only): at a fixed value of one the other still goes its way
    X = np.array([[1, 0, 0], [1, 1, 0], [1, 0, 1]], dtype=float)
    events, trials = np.array([4.0, 0.0, 6.0]), np.array([10.0, 7.0, 6.0])
    both = BinomialLikelihood(X, events, trials=trials)
    verdict = separation(X, events, trials)
    limits = one_sided_limits(both, verdict, finite_part(both, verdict))
    for j, status in ((1, "at or below"), (2, "at or above")):
        rows = [0, j]
        alone = BinomialLikelihood(X[rows][:, rows], events[rows], trials=trials[rows])
        told = separation(X[rows][:, rows], events[rows], trials[rows])
        single = one_sided_limits(alone, told, finite_part(alone, told))[1]
        assert limits[j].status == single.status == status
        assert limits[j].limit == pytest.approx(single.limit, abs=1e-8)


def test_records_tied_within_rounding() -> None:
    # 0.3 and 0.1 + 0.2 taken as one value: two records of one event, as if the value were the same
    x = np.array([0.0, 0.1, 0.3, 0.1 + 0.2, 0.7, 0.9])
    X, y = np.column_stack([np.ones(6), x]), np.array([0.0, 0.0, 1.0, 0.0, 1.0, 1.0])
    verdict = separation(X, y, np.ones(6))
    part = finite_part(BinomialLikelihood(X, y), verdict)
    assert verdict.inexact == "within rounding"
    assert part.coefficients == (None, None)
    assert part.log_likelihood == pytest.approx(2 * np.log(0.5), abs=1e-12)


def test_rows_that_are_not_in_memory() -> None:
    rng = np.random.default_rng(6)
    n = 70_000
    x, level = rng.normal(size=n), rng.integers(0, 3, n)
    X = np.column_stack([np.ones(n), x, level == 1, level == 2]).astype(float)
    y = (rng.random(n) < 1 / (1 + np.exp(-x))).astype(float)
    y[level == 2] = 1.0
    here = BinomialLikelihood(X, y)
    away = BinomialLikelihood.over(LocalPasses(MemorySource({"X": X, "events": y})).mapped(_same), 4)
    verdict = separation(X, y, np.ones(n))
    parts = [finite_part(one, verdict) for one in (here, away)]
    assert parts[0].finite == parts[1].finite == (0, 1, 2)
    assert parts[0].coefficients[:3] == pytest.approx(parts[1].coefficients[:3], abs=1e-10)
    assert parts[0].log_likelihood == pytest.approx(parts[1].log_likelihood, abs=1e-6)
    limits = [one_sided_limits(one, verdict, part)[3] for one, part in zip((here, away), parts, strict=True)]
    assert limits[0].status == "at or above"
    assert limits[0].limit == pytest.approx(limits[1].limit, abs=1e-7)


def _same(rows: Leaf) -> Leaf:
    return rows


def test_a_constant_profile_is_where_enumeration_says_so() -> None:
    # complete separation by two columns that can each go either way
    X = np.array([[1, -2, -1], [1, -1, -2], [1, 1, 2], [1, 2, 1]], dtype=float)
    y = np.array([0.0, 0.0, 1.0, 1.0])
    assert enumerated(X, y, np.ones(4)).coefficients == ("undetermined",) * 3
    verdict, likelihood = separation(X, y, np.ones(4)), BinomialLikelihood(X, y)
    part = finite_part(likelihood, verdict)
    assert part.status == "no rows kept"
    limits = one_sided_limits(likelihood, verdict, part)
    assert [(one.status, one.limit) for one in limits] == [("flat", None)] * 3
    assert part.log_likelihood == 0.0
