"""Exact estimates, limits and tests against scipy, published values and direct computation in mpmath."""

from __future__ import annotations

import dataclasses
from fractions import Fraction
from math import comb

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import logit
from scipy.stats import binom, binomtest, fisher_exact, multivariate_hypergeom, nchypergeom_fisher
from scipy.stats.contingency import odds_ratio

from oddsmodel.inference.exact import ExactInference, exact_inference, exact_joint_test

NUMBERS = [f.name for f in dataclasses.fields(ExactInference) if f.name not in ("status", "distribution")]


def numbers(result: ExactInference) -> list[float | None]:
    return [getattr(result, name) for name in NUMBERS]


def of_table(a: int, b: int, c: int, d: int, level: float = 0.95) -> ExactInference:
    """Cases a, c and others b, d; exposed a, b."""
    X = np.array([[1.0, 1.0], [1.0, 0.0]])
    return exact_inference(X, np.array([a, c], float), np.array([a + b, c + d], float), 1, level=level)


@pytest.mark.parametrize(
    "table", [(7, 5, 3, 12), (1, 9, 11, 3), (96, 109, 104, 666), (189, 10845, 104, 10933), (20, 30, 2, 90)]
)
@pytest.mark.parametrize("level", [0.9, 0.95])
def test_one_exposure_against_scipy(table: tuple[int, int, int, int], level: float) -> None:
    """scipy.stats.contingency.odds_ratio and scipy.stats.fisher_exact."""
    result = of_table(*table, level=level)
    square = np.array(table).reshape(2, 2)
    reference = odds_ratio(square, kind="conditional")
    limits = reference.confidence_interval(level)
    # scipy searches to about 1e-9
    assert np.exp(result.estimate) == pytest.approx(reference.statistic, rel=1e-7)
    assert np.exp(result.lower) == pytest.approx(limits.low, rel=1e-7)
    assert np.exp(result.upper) == pytest.approx(limits.high, rel=1e-7)
    assert result.p_by_probability == pytest.approx(fisher_exact(square).pvalue, rel=1e-7)
    tails = [fisher_exact(square, alternative=side).pvalue for side in ("less", "greater")]
    assert result.p_doubled == pytest.approx(min(1.0, 2 * min(tails)), rel=1e-7)


# HIV infection of newborns by CD4 and CD8 level (Hutto et al. 1991), as analysed by Mehta & Patel 1995; data and
# values from memory.
INFANTS = np.array(
    # CD4, CD8, infected, infants
    [(0, 2, 1, 1), (1, 2, 2, 2), (0, 0, 4, 7), (1, 1, 4, 12), (2, 2, 1, 3), (1, 0, 2, 7), (2, 0, 0, 2), (2, 1, 0, 13)],
    dtype=float,
)


def test_published_values_of_two_ordered_columns() -> None:
    X = np.column_stack([np.ones(8), INFANTS[:, :2]])
    cd4 = exact_inference(X, INFANTS[:, 2], INFANTS[:, 3], 1)
    assert cd4.estimate == pytest.approx(-2.388, abs=5e-4)
    assert (cd4.lower, cd4.upper) == pytest.approx((-4.700, -0.822), abs=5e-4)
    assert cd4.p_doubled == pytest.approx(0.0004, abs=5e-5)
    cd8 = exact_inference(X, INFANTS[:, 2], INFANTS[:, 3], 2)
    assert cd8.estimate == pytest.approx(1.592, abs=5e-4)
    assert (cd8.lower, cd8.upper) == pytest.approx((-0.014, 3.908), abs=5e-4)
    assert cd8.p_doubled == pytest.approx(0.0528, abs=5e-5)


def by_mpmath(result: ExactInference, tail: float) -> list[float | None]:
    """The numbers of `NUMBERS` from the distribution's whole numbers of outcomes, by bisection at 30 digits."""
    with mpmath.workdps(30):
        distribution = result.distribution
        t = [mpmath.mpf(float(d)) for d in distribution.distance[:, 0]]
        c = [mpmath.mpf(round(w)) for w in np.exp(distribution.log_weight)]

        def share(theta, keep):
            weights = [w * mpmath.exp(theta * d) for w, d in zip(c, t, strict=True)]
            return mpmath.fsum(w * keep(d) for w, d in zip(weights, t, strict=True)) / mpmath.fsum(weights)

        def root(rising):
            low, high = mpmath.mpf(-60), mpmath.mpf(60)
            for _ in range(90):
                middle = (low + high) / 2
                low, high = (low, middle) if rising(middle) > 0 else (middle, high)
            return float(low)

        def at_least(half):
            return lambda d: 1 if d > 0 else (half if d == 0 else 0)

        def at_most(half):
            return lambda d: 1 if d < 0 else (half if d == 0 else 0)

        def lower(p, half):
            return None if min(t) == 0 else root(lambda theta: share(theta, at_least(half)) - p)

        def upper(p, half):
            return None if max(t) == 0 else root(lambda theta: p - share(theta, at_most(half)))

        halves = [h for h in (lower(0.5, 1), upper(0.5, 1)) if h is not None]
        half = mpmath.mpf(1) / 2
        observed = c[t.index(0)]
        return [
            None if 0 in (min(t), max(t)) else root(lambda theta: share(theta, lambda d: d)),
            sum(halves) / len(halves),
            lower(tail, 1),
            upper(tail, 1),
            lower(tail, half),
            upper(tail, half),
            min(1.0, 2 * float(min(share(0, at_least(1)), share(0, at_most(1))))),
            float(mpmath.fsum(w for w in c if w <= observed) / mpmath.fsum(c)),
            min(1.0, 2 * float(min(share(0, at_least(half)), share(0, at_most(half))))),
        ]


def small_data(seed: int):
    rng = np.random.default_rng(seed)
    n = int(rng.integers(7, 25))
    X = np.column_stack([np.ones(n), rng.integers(0, 2, (n, 2)), rng.integers(0, 4, n)]).astype(float)
    return X, rng.integers(0, 2, n).astype(float), np.ones(n)


def test_every_number_against_mpmath() -> None:
    seen = set()
    for seed in range(90):
        result = exact_inference(*small_data(seed), 1, level=0.9)
        seen.add(result.status)
        if result.status == "no information":
            continue
        for name, found, expected in zip(NUMBERS, numbers(result), by_mpmath(result, 0.05), strict=True):
            assert found == (None if expected is None else pytest.approx(expected, rel=1e-10, abs=1e-10)), (seed, name)
    assert seen >= {"finite", "plus infinity", "minus infinity"}


def test_the_greatest_possible_sum_has_a_median_unbiased_estimate_and_one_limit() -> None:
    """6 of 6 exposed and 3 of 8 others with the event: only P(T = 6) is in the upper tail."""
    result = of_table(6, 0, 3, 5)
    assert (result.status, result.estimate, result.upper, result.mid_p_upper) == ("plus infinity", None, None, None)

    def probability_of_observed(theta: float) -> float:
        return float(nchypergeom_fisher(14, 6, 9, np.exp(theta)).pmf(6))

    assert probability_of_observed(result.median_unbiased) == pytest.approx(0.5, rel=1e-9)
    assert probability_of_observed(result.lower) == pytest.approx(0.025, rel=1e-9)
    assert probability_of_observed(result.mid_p_lower) == pytest.approx(0.05, rel=1e-9)
    opposite = of_table(0, 6, 5, 3)
    assert opposite.status == "minus infinity"
    assert opposite.upper == pytest.approx(-result.lower, rel=1e-12)
    assert opposite.median_unbiased == pytest.approx(-result.median_unbiased, rel=1e-12)


@pytest.mark.parametrize("events", [[0.0, 0.0, 0.0], [1.0, 1.0, 1.0], [1.0, 0.0, 1.0]])
def test_a_sum_that_can_have_one_value_only_gives_no_information(events: list[float]) -> None:
    """All or none with the event; or a third column that is determined by the others."""
    X = np.array([[1.0, 0.0, 1.0], [1.0, 1.0, 4.0], [1.0, 2.0, 16.0]])
    result = exact_inference(X, np.array(events), np.ones(3), 2)
    assert result.status == "no information"
    assert numbers(result) == [None] * 9
    assert result.distribution.log_weight.tolist() == [0.0]


def test_matched_pairs_are_a_binomial_of_the_discordant_ones() -> None:
    """9 pairs with the case exposed, 2 with the control exposed: P(T = t) = C(11, t) p^t (1-p)^(11-t), odds p/(1-p)."""
    exposed = np.array([[1, 0]] * 9 + [[0, 1]] * 2 + [[1, 1]] * 4 + [[0, 0]] * 6, float).reshape(-1, 1)
    events = np.tile([1.0, 0.0], 21)
    result = exact_inference(exposed, events, np.ones(42), 0, strata=np.repeat(np.arange(21), 2))

    def p(theta: float) -> float:
        return float(1.0 / (1.0 + np.exp(-theta)))

    assert result.estimate == pytest.approx(np.log(9 / 2), rel=1e-12)
    assert binom.sf(8, 11, p(result.lower)) == pytest.approx(0.025, rel=1e-9)
    assert binom.cdf(9, 11, p(result.upper)) == pytest.approx(0.025, rel=1e-9)
    assert result.p_doubled == pytest.approx(2 * binom.sf(8, 11, 0.5), rel=1e-12)
    assert result.p_mid == pytest.approx(2 * binom.sf(8, 11, 0.5) - binom.pmf(9, 11, 0.5), rel=1e-12)


def test_an_intercept_alone_is_a_binomial_proportion() -> None:
    """scipy.stats.binomtest: the limits of Clopper & Pearson 1934 and the test by probability."""
    result = exact_inference(np.ones((1, 1)), np.array([3.0]), np.array([17.0]), 0)
    reference = binomtest(3, 17, 0.5)
    limits = reference.proportion_ci(0.95, method="exact")
    assert result.estimate == pytest.approx(np.log(3 / 14), rel=1e-12)
    assert (result.lower, result.upper) == pytest.approx((logit(limits.low), logit(limits.high)), rel=1e-9)
    assert result.p_by_probability == pytest.approx(reference.pvalue, rel=1e-9)


def test_a_common_odds_ratio_over_strata() -> None:
    """The distribution of the sum of one cell over 2×2 tables: hypergeometric weights multiplied as polynomials."""
    tables = [(2, 3, 1, 4), (4, 1, 2, 5), (1, 6, 0, 3)]
    product: dict[int, int] = {0: 1}
    for a, b, c, d in tables:
        weights = {x: comb(a + b, x) * comb(c + d, a + c - x) for x in range(max(0, a - d), min(a + b, a + c) + 1)}
        product = {
            s: sum(w * weights.get(s - x, 0) for x, w in product.items())
            for s in range(max(product) + max(weights) + 1)
        }
    X = np.tile([[1.0], [0.0]], (3, 1))
    events = np.array([[a, c] for a, _, c, _ in tables], float).reshape(-1)
    trials = np.array([[a + b, c + d] for a, b, c, d in tables], float).reshape(-1)
    found = exact_inference(X, events, trials, 0, strata=["north", "north", "south", "south", "west", "west"])
    values = found.distribution.distance[:, 0].astype(int) + 7
    expected = {s: w for s, w in product.items() if w}
    assert dict(zip(values.tolist(), np.rint(np.exp(found.distribution.log_weight)), strict=True)) == expected


@pytest.mark.parametrize("cells", [[[3, 9], [8, 4], [2, 7]], [[0, 5], [6, 3], [1, 8]]])
def test_several_levels_against_scipy(cells: list[list[int]]) -> None:
    """An exposure with three levels: all tables no more probable than the one seen (Freeman & Halton 1951), with
    the probabilities of scipy.stats.multivariate_hypergeom."""
    events, trials = np.array(cells)[:, 0], np.array(cells).sum(axis=1)
    law = multivariate_hypergeom(trials, events.sum())
    tables = [(i, j, events.sum() - i - j) for i in range(trials[0] + 1) for j in range(trials[1] + 1)]
    pmf = np.array([float(law.pmf(t)) for t in tables if 0 <= t[2] <= trials[2]])
    X = np.array([[1.0, 0.0, 0.0], [1.0, 1.0, 0.0], [1.0, 0.0, 1.0]])
    result = exact_joint_test(X, events.astype(float), trials.astype(float), [1, 2])
    expected = pmf[pmf <= float(law.pmf(events)) * (1 + 1e-8)].sum()
    assert result.p_by_probability == pytest.approx(expected, rel=1e-9)
    assert (result.df, len(pmf)) == (2, len(result.distribution.log_weight))


def test_the_score_test_by_its_definition() -> None:
    """(t - E)'V⁻¹(t - E) from the covariance that numpy computes; p as the sum of its exact distribution."""
    X, events, trials = small_data(3)
    result = exact_joint_test(X, events, trials, [1, 3])
    t, weight = result.distribution.distance, np.exp(result.distribution.log_weight)
    mean = np.average(t, axis=0, weights=weight)
    variance = np.cov(t.T, aweights=weight, ddof=0)
    score = [float((v - mean) @ np.linalg.solve(variance, v - mean)) for v in t]
    assert result.score == pytest.approx(score[result.distribution.place], rel=1e-10)
    large = np.array(score) >= result.score * (1 - 1e-8)
    assert result.p_score == pytest.approx(weight[large].sum() / weight.sum(), rel=1e-10)


def test_the_score_test_of_columns_that_tell_the_same_has_one_degree_of_freedom() -> None:
    X, events, trials = small_data(5)
    double = np.column_stack([X, 3.0 * X[:, 1], np.zeros(len(X))])
    test = exact_joint_test(double, events, trials, [1, 4, 5])
    alone = exact_joint_test(X, events, trials, [1])
    assert (test.df, alone.df) == (1, 1)
    assert (test.score, test.p_score) == pytest.approx((alone.score, alone.p_score), rel=1e-9)
    nothing = exact_joint_test(X, np.zeros(len(X)), trials, [1, 2])
    assert (nothing.df, nothing.score, nothing.p_score, nothing.p_by_probability) == (0, None, None, None)


@pytest.mark.parametrize("level", [0.0, 1.0])
def test_a_level_outside_its_range(level: float) -> None:
    with pytest.raises(ValueError, match="level"):
        of_table(1, 2, 3, 4, level=level)


CASES = settings(deadline=None, derandomize=True, max_examples=40)


@CASES
@given(st.integers(0, 10_000), st.sampled_from([0.1, 2.0, 10.0, 1 / 3, 7.77]))
def test_properties_of_one_coefficient(seed: int, factor: float) -> None:
    X, events, trials = small_data(seed)
    result = exact_inference(X, events, trials, 3)

    shuffled = np.random.default_rng(seed).permutation(len(X))
    same = exact_inference(X[shuffled], events[shuffled], trials, 3)
    assert numbers(same) == numbers(result)

    swapped = exact_inference(X, trials - events, trials, 3)
    flipped = [None if number is None else -number for number in numbers(swapped)]
    order = [0, 1, 3, 2, 5, 4]
    for mine, theirs in zip(numbers(result)[:6], [flipped[j] for j in order], strict=True):
        assert mine == (None if theirs is None else pytest.approx(theirs, rel=1e-9, abs=1e-9))
    assert numbers(swapped)[6:] == [None if p is None else pytest.approx(p, rel=1e-9) for p in numbers(result)[6:]]

    scaled = X.copy()
    scaled[:, 3] = X[:, 3] * factor + (0.0 if factor < 1 else 5.0)
    again = exact_inference(scaled, events, trials, 3)
    for k, (mine, theirs) in enumerate(zip(numbers(again), numbers(result), strict=True)):
        expected = None if theirs is None else theirs / (factor if k < 6 else 1.0)
        assert mine == (None if expected is None else pytest.approx(expected, rel=1e-9, abs=1e-9))


@CASES
@given(st.integers(0, 10_000))
def test_patterns_say_what_their_records_say(seed: int) -> None:
    X, events, trials = small_data(seed)
    patterns, index = np.unique(X, axis=0, return_inverse=True)
    index = index.reshape(-1)
    collapsed = exact_inference(patterns, np.bincount(index, weights=events), np.bincount(index).astype(float), 1)
    assert numbers(collapsed) == numbers(exact_inference(X, events, trials, 1))


def test_wider_levels_and_mid_p_limits_are_nested() -> None:
    for seed in range(20):
        X, events, trials = small_data(seed)
        wide, narrow = (exact_inference(X, events, trials, 1, level=level) for level in (0.99, 0.9))
        for lower, inner in ((wide.lower, narrow.lower), (wide.lower, wide.mid_p_lower)):
            assert lower is None or lower <= inner
        for upper, inner in ((wide.upper, narrow.upper), (wide.upper, wide.mid_p_upper)):
            assert upper is None or upper >= inner


def test_thirds_are_equal_when_they_are_written_so() -> None:
    """Columns in thirds have the same distribution as in whole numbers."""
    X, events, trials = small_data(8)
    thirds = X.copy()
    thirds[:, 2:] = [[float(Fraction(int(x), 3)) for x in row] for row in X[:, 2:]]
    by_thirds, whole = exact_inference(thirds, events, trials, 1), exact_inference(X, events, trials, 1)
    assert numbers(by_thirds) == numbers(whole)
