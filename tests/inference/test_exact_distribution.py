"""Exact conditional distributions against the enumeration of all outcomes."""

from __future__ import annotations

from collections import Counter
from fractions import Fraction
from math import comb

import numpy as np
import pytest

from oddsmodel.inference.exact import (
    BeyondBudget,
    Budget,
    ConditionalDistribution,
    ManyValuedColumn,
    arithmetic,
    conditional_distribution,
    convolution,
)
from oddsmodel.inference.exact.whole_numbers import whole_numbers

Counts = dict[tuple[Fraction, ...], int]


def enumerated(X, events, trials, positions, strata=None) -> Counts:
    """Numbers of outcomes by the distance of the sums of interest from the observed ones, in whole twentieths."""
    exact = np.rint(20 * X).astype(np.int64)
    assert (exact / 20 == X).all()
    if strata is not None:
        exact = np.column_stack([exact, np.asarray(strata)[:, None] == np.unique(strata)])
    y = np.indices([int(n) + 1 for n in trials]).reshape(len(trials), -1).T
    ways = np.array([[comb(int(n), k) for k in range(4)] for n in trials])[np.arange(len(trials)), y].prod(axis=1)
    distance = (y - events.astype(np.int64)) @ exact
    others = np.delete(distance, positions, axis=1)
    found: Counter = Counter()
    for row, number in zip(distance[~others.any(axis=1)][:, positions], ways[~others.any(axis=1)], strict=True):
        found[tuple(Fraction(int(d), 20) for d in row)] += int(number)
    return dict(found)


def as_counts(distribution: ConditionalDistribution) -> Counts:
    """Numbers of outcomes as whole numbers, which they must be to a relative 1e-11."""
    number = np.exp(distribution.log_weight)
    np.testing.assert_allclose(number, np.rint(number), rtol=1e-11)
    keys = [tuple(Fraction(float(d)).limit_denominator(10**6) for d in row) for row in distribution.distance]
    assert len(set(keys)) == len(keys)
    return dict(zip(keys, np.rint(number).astype(int).tolist(), strict=True))


def drawn(kind: str, seed: int):
    """A small data set of a kind: X, events, trials, strata."""
    rng = np.random.default_rng((seed, *kind.encode()))
    n = 8 if kind == "grouped" else 11
    one = np.ones(n)
    trials, strata = one, None
    if kind == "two-valued columns":
        X = np.column_stack([one, rng.integers(0, 2, (n, 3))])
    elif kind == "whole numbers below zero":
        X = np.column_stack([one, rng.integers(-3, 4, (n, 2)), rng.integers(0, 2, n)])
    elif kind == "tenths":
        X = np.column_stack([one, rng.integers(0, 8, n) / 10, rng.integers(0, 3, n) / 2 - 0.5])
    elif kind == "no intercept":
        X = rng.integers(-2, 3, (n, 2)).astype(float)
    elif kind == "repeated and zero columns":
        x = rng.integers(0, 2, (n, 2))
        X = np.column_stack([one, x, x[:, 1] + 1, np.zeros(n), 2 - x[:, 1]])
    elif kind == "grouped":
        X = np.column_stack([one, rng.integers(0, 3, n), rng.integers(0, 2, n)])
        trials = rng.integers(0, 4, n).astype(float)
    elif kind == "strata":
        X, strata = rng.integers(0, 3, (n, 2)).astype(float), rng.integers(0, 3, n)
    else:
        X = np.column_stack([one, rng.integers(0, 2, (n, 2))]).astype(float)
        trials, strata = rng.integers(1, 3, n).astype(float), np.array(list("babacabcaba"))
    return X.astype(float), rng.binomial(trials.astype(int), 0.45).astype(float), trials, strata


KINDS = (
    "two-valued columns",
    "whole numbers below zero",
    "tenths",
    "no intercept",
    "repeated and zero columns",
    "grouped",
    "strata",
    "strata of grouped records",
)


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("seed", range(3))
def test_every_value_and_its_number_of_outcomes(kind: str, seed: int) -> None:
    X, events, trials, strata = drawn(kind, seed)
    for position in (0, 1):
        found = conditional_distribution(X, events, trials, [position], strata=strata)
        assert as_counts(found) == enumerated(X, events, trials, [position], strata)
        assert found.distance[found.place, 0] == 0.0
        assert (np.diff(found.distance[:, 0]) > 0).all()


@pytest.mark.parametrize("kind", KINDS)
def test_two_columns_together(kind: str) -> None:
    X, events, trials, strata = drawn(kind, 7)
    found = conditional_distribution(X, events, trials, [1, 0], strata=strata)
    assert as_counts(found) == enumerated(X, events, trials, [1, 0], strata)
    assert not found.distance[found.place].any()


@pytest.mark.parametrize("kind", KINDS)
def test_logarithms_and_sorted_keys_give_the_same(kind: str, monkeypatch: pytest.MonkeyPatch) -> None:
    X, events, trials, strata = drawn(kind, 11)
    expected = as_counts(conditional_distribution(X, events, trials, [1], strata=strata))
    monkeypatch.setattr(arithmetic, "MOST_COUNTED", 0.0)
    assert as_counts(conditional_distribution(X, events, trials, [1], strata=strata)) == expected
    monkeypatch.setattr(convolution, "TABLE_FROM", 0)
    monkeypatch.setattr(convolution, "TABLE_FACTOR", 0)
    monkeypatch.setattr(convolution, "BLOCK", 3)
    assert as_counts(conditional_distribution(X, events, trials, [1], strata=strata)) == expected


def test_more_nuisance_columns_than_orders_are_tried() -> None:
    rng = np.random.default_rng(5)
    X = np.column_stack([np.ones(12), rng.integers(0, 2, (12, 6))]).astype(float)
    events = rng.integers(0, 2, 12).astype(float)
    found = conditional_distribution(X, events, np.ones(12), [1])
    assert as_counts(found) == enumerated(X, events, np.ones(12), [1])


def test_numbers_of_outcomes_far_beyond_whole_numbers() -> None:
    """Two groups of 700 records: C(700, x) C(700, 600 - x) from whole numbers of any length."""
    X = np.array([[1.0, 1.0], [1.0, 0.0]])
    found = conditional_distribution(X, np.array([320.0, 280.0]), np.array([700.0, 700.0]), [1])
    places = found.distance[:, 0].astype(int) + 320
    assert places.tolist() == list(range(601))
    for at in (0, 1, 150, 320, 599):
        expected = comb(700, at) * comb(700, 600 - at)
        shift = expected.bit_length() - 60
        log_expected = np.log(float(expected >> shift)) + shift * np.log(2.0)
        assert found.log_weight[at] == pytest.approx(log_expected, rel=1e-13)


def test_strata_are_intercepts_of_their_own() -> None:
    X, events, trials, strata = drawn("strata", 2)
    indicators = (np.asarray(strata)[:, None] == np.unique(strata)).astype(float)
    by_label = conditional_distribution(X, events, trials, [0], strata=strata)
    by_column = conditional_distribution(np.column_stack([X, indicators]), events, trials, [0])
    assert as_counts(by_label) == as_counts(by_column)


def test_a_column_that_is_the_same_within_each_stratum_changes_nothing() -> None:
    """Even where it has no common unit, as the intercepts of the strata determine its sum."""
    X, events, trials, strata = drawn("strata", 4)
    by_stratum = np.random.default_rng(1).normal(size=3)[strata]
    with_it = conditional_distribution(np.column_stack([X, by_stratum]), events, trials, [0], strata=strata)
    assert as_counts(with_it) == as_counts(conditional_distribution(X, events, trials, [0], strata=strata))


def test_decimal_fractions_are_what_they_are_written_as() -> None:
    """0.1 + 0.2 is 0.3 as written, not in floating point."""
    whole, unit = whole_numbers(np.array([0.1, 0.2, 0.3, -1.25, 7.0]), from_zero=True)
    assert (whole * unit).tolist() == pytest.approx([0.1, 0.2, 0.3, -1.25, 7.0], abs=1e-15)
    assert whole.tolist() == [10, 20, 30, -125, 700]


@pytest.mark.parametrize("divisor", [3.0, 7.123456789, np.sqrt(2.0)])
def test_whole_numbers_divided_by_anything_are_found(divisor: float) -> None:
    years = np.array([21.0, 35.0, 36.0, 50.0, 77.0, 35.0])
    whole, unit = whole_numbers((years - 41.3) / divisor, from_zero=False)
    assert (whole - whole[0]).tolist() == (years - years[0]).tolist()
    assert unit == pytest.approx(1.0 / divisor, rel=1e-13)


def test_numbers_without_a_common_unit_are_refused_with_their_column() -> None:
    rng = np.random.default_rng(4)
    X = np.column_stack([np.ones(20), rng.integers(0, 2, 20), rng.normal(size=20)]).astype(float)
    with pytest.raises(ManyValuedColumn, match="position 2") as refused:
        conditional_distribution(X, rng.integers(0, 2, 20).astype(float), np.ones(20), [1])
    assert refused.value.column == 2


def test_sums_too_many_for_a_key_are_refused_with_the_most_varied_column() -> None:
    rng = np.random.default_rng(4)
    fine = np.round(rng.normal(size=(40, 4)) * 1000, 6)
    X = np.column_stack([np.ones(40), rng.integers(0, 2, 40), fine]).astype(float)
    X[0, 2] = X[1, 2]
    with pytest.raises(ManyValuedColumn) as refused:
        conditional_distribution(X, rng.integers(0, 2, 40).astype(float), np.ones(40), [1])
    assert refused.value.column == 3


@pytest.mark.parametrize(
    ("budget", "limit"),
    [(Budget(states=40), "states"), (Budget(bytes=2000), "bytes"), (Budget(seconds=0.0), "seconds")],
)
def test_a_budget_that_does_not_suffice_says_how_far_it_got(budget: Budget, limit: str) -> None:
    rng = np.random.default_rng(9)
    X = np.column_stack([np.ones(60), rng.integers(0, 3, (60, 3))]).astype(float)
    with pytest.raises(BeyondBudget) as given_up:
        conditional_distribution(X, rng.integers(0, 2, 60).astype(float), np.ones(60), [1], budget=budget)
    told = given_up.value
    assert told.limit == limit
    assert told.patterns == len(np.unique(X, axis=0))
    assert 0 <= told.patterns_done < told.patterns
    assert told.seconds >= 0.0
    assert told.states > 40 or limit != "states"


def test_progress_tells_of_every_pattern() -> None:
    class Told:
        total, done = 0, 0

        def stage(self, name: str, total: int | None = None) -> None:
            self.total = total or 0

        def advance(self, steps: int = 1) -> None:
            self.done += steps

    X, events, trials, _ = drawn("two-valued columns", 0)
    told = Told()
    found = conditional_distribution(X, events, trials, [1], progress=told)
    assert told.done == told.total == found.patterns


@pytest.mark.parametrize(
    ("events", "trials", "positions"),
    [
        ([0.5, 1.0], [1.0, 1.0], [1]),
        ([2.0, 1.0], [1.0, 1.0], [1]),
        ([1.0], [1.0], [1]),
        ([1.0, 0.0], [1.0, 1.0], []),
        ([1.0, 0.0], [1.0, 1.0], [1, 1]),
        ([1.0, 0.0], [1.0, 1.0], [-1]),
    ],
)
def test_arrays_that_do_not_fit(events: list[float], trials: list[float], positions: list[int]) -> None:
    with pytest.raises(ValueError, match="must"):
        conditional_distribution(np.eye(2), np.array(events), np.array(trials), positions)
