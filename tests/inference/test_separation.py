"""Separation against enumeration in whole numbers, hand-made cases, and proofs checked in fractions."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
from scipy.special import expit

from oddsmodel.inference import maximise, separation, separation_of_differences
from oddsmodel.likelihood import BinomialLikelihood

sys.path.insert(0, str(Path(__file__).parent))
from enumerated_cone import assert_proved, enumerated


@pytest.mark.parametrize("largest", [1, 2, 9])
def test_no_separated_data_set_slips_past(largest: int) -> None:
    # against enumeration of the cone's extreme rays: fits, verdicts, rows and coefficients; proofs in fractions
    rng = np.random.default_rng(70 + largest)
    seen: dict[object, int] = {}
    for case in range(700):
        p, n = int(rng.integers(1, 5)), int(rng.integers(4, 15))
        X = rng.integers(0 if largest == 1 else -largest, largest + 1, size=(n, p)).astype(float)
        if case % 4:
            X[:, 0] = 1.0
        trials = rng.integers(0, 4, n).astype(float) if case % 2 else np.ones(n)
        linear = X @ rng.normal(size=p) * rng.choice([0.0, 1.0, 4.0])
        events = rng.binomial(trials.astype(int), 1 / (1 + np.exp(-linear))).astype(float)
        if np.linalg.matrix_rank(X[trials > 0]) < p:
            continue
        expected = enumerated(X, events, trials)
        fit = maximise(BinomialLikelihood(X, events, trials=trials))
        assert fit.status == ("no finite maximum" if expected.separated else "converged")
        verdict = fit.separation if expected.separated else separation(X, events, trials)
        assert verdict is not None
        assert (verdict.separated, verdict.complete) == (expected.separated, expected.complete)
        assert verdict.rows.tolist() == expected.rows
        assert verdict.coefficients == expected.coefficients
        assert_proved(verdict, X, events, trials)
        for kind in (expected.separated, *set(expected.coefficients)):
            seen[kind] = seen.get(kind, 0) + 1
    assert sum(seen[one] for one in (True, False)) > 600
    assert min(seen.values()) > 100


def test_quasi_complete_separation_names_the_coefficient() -> None:
    # an exposure level with no events: its log odds ratio falls without end, the others are finite
    X = np.array([[1, 0, 0], [1, 0, 1], [1, 1, 0], [1, 1, 1]], dtype=float)
    events, trials = np.array([5.0, 8.0, 0.0, 0.0]), np.array([20.0, 20.0, 10.0, 10.0])
    verdict = separation(X, events, trials)
    assert verdict.separated
    assert not verdict.complete
    assert verdict.coefficients == ("finite", "minus infinity", "finite")
    assert verdict.rows.tolist() == [False, False, True, True]
    fit = maximise(BinomialLikelihood(X, events, trials=trials))
    assert fit.status == "no finite maximum"


def test_a_rare_but_overlapping_outcome_is_not_called_separated() -> None:
    X = np.column_stack([np.ones(4), [0.0, 1.0, 2.0, 3.0]])
    fit = maximise(BinomialLikelihood(X, [1.0, 0.0, 1.0, 1.0], trials=[1e10, 1e10, 1e10, 1e10]))
    assert fit.status == "converged"
    assert not separation(X, np.array([1.0, 0.0, 1.0, 1.0]), np.full(4, 1e10)).separated


def test_saturated_grouped_data_are_not_called_separated() -> None:
    X = np.array([[1, 0], [1, 1]], dtype=float)
    fit = maximise(BinomialLikelihood(X, [3.0, 7.0], trials=[10.0, 10.0]))
    assert fit.status == "converged"
    assert fit.coefficients[1] == pytest.approx(np.log(7 * 7 / (3 * 3)), abs=1e-12)


def test_a_restricted_space_can_be_separated_too() -> None:
    X = np.column_stack([np.ones(6), [0, 0, 0, 1, 1, 1], [0, 1, 0, 1, 0, 1]]).astype(float)
    y = np.array([0.0, 0.0, 0.0, 1.0, 1.0, 1.0])
    assert maximise(BinomialLikelihood(X, y), basis=np.eye(3)[:, :2]).status == "no finite maximum"
    assert maximise(BinomialLikelihood(X, y), basis=np.eye(3)[:, [0, 2]]).status == "converged"


def test_every_kind_of_number_is_proved() -> None:
    # continuous, rounded and standardised columns, powers of a calendar year, scales far apart, and rank-deficient ones
    rng = np.random.default_rng(4)
    seen = {True: 0, False: 0}
    for case in range(150):
        p, n = int(rng.integers(2, 6)), int(rng.integers(8, 50))
        indicators = (rng.random((n, p)) < rng.choice([0.1, 0.3, 0.5], p)).astype(float)
        year = rng.integers(1990, 2021, n).astype(float)
        X = [
            rng.normal(size=(n, p)),
            np.round(rng.normal(size=(n, p)), 1) + rng.choice([0.0, 1e-12, -1e-9], (n, p)),
            (indicators - indicators.mean(axis=0)) / np.maximum(indicators.std(axis=0), 0.1),
            np.column_stack([year**k for k in range(min(p, 4))]),
            rng.normal(size=(n, p)) * 10.0 ** rng.integers(-8, 9, p),
        ][case % 5]
        X[:, 0] = 1.0
        linear = (X - X.mean(axis=0)) / np.maximum(X.std(axis=0), 1e-9) @ rng.normal(size=X.shape[1])
        y = (rng.random(n) < expit(linear * rng.choice([0.5, 5.0, 1e3]))).astype(float)
        verdict = separation(X, y, np.ones(n))
        seen[verdict.separated] += 1
        assert_proved(verdict, X, y, np.ones(n))
    assert min(seen.values()) > 40


def test_numbers_at_the_ends_of_the_range() -> None:
    X = np.array([[1.0, 1e300, -1e-310], [1.0, -1e300, 5e-324], [1.0, 1e299, 0.0], [1.0, 0.0, 1e-310]])
    for y in ([0.0, 1.0, 0.0, 1.0], [0.0, 0.0, 1.0, 1.0]):
        verdict = separation(X, np.array(y), np.ones(4))
        assert verdict.separated
        assert_proved(verdict, X, np.array(y), np.ones(4))


def test_an_overlap_of_no_more_than_rounding_is_said_to_be_one() -> None:
    # the two middle values are both meant to be 0.3; as floats they overlap by one unit in the last place
    x = np.array([0.0, 0.1, 0.3, 0.1 + 0.2, 0.7, 0.9])
    X, y = np.column_stack([np.ones(6), x]), np.array([0.0, 0.0, 1.0, 0.0, 1.0, 1.0])
    verdict = separation(X, y, np.ones(6))
    assert verdict.separated
    assert not verdict.verified
    assert verdict.inexact == "within rounding"
    assert verdict.witness is None
    assert verdict.rows.tolist() == [True, True, False, False, True, True]
    assert verdict.coefficients == ("minus infinity", "plus infinity")
    assert maximise(BinomialLikelihood(X, y)).status == "no finite maximum"


@pytest.mark.parametrize("overlap", [1e-2, 1e-6, 1e-10, 1e-12])
def test_a_small_overlap_beyond_rounding_has_a_finite_maximum(overlap: float) -> None:
    x = np.concatenate([np.linspace(0.0, 0.5, 10), [0.5 - overlap], np.linspace(0.55, 1.0, 9)])
    X, y = np.column_stack([np.ones(20), x]), np.repeat([0.0, 1.0], 10)
    verdict = separation(X, y, np.ones(20))
    assert not verdict.separated
    assert_proved(verdict, X, y, np.ones(20))
    assert maximise(BinomialLikelihood(X, y)).status == "converged"


def test_very_many_columns_are_decided_without_a_proof() -> None:
    rng = np.random.default_rng(2)
    levels = rng.integers(0, 205, 3000)
    X = np.column_stack([np.ones(3000), levels[:, None] == np.arange(1, 205)]).astype(float)
    y = (rng.random(3000) < 0.5).astype(float)
    y[levels == 7], y[levels == 9] = 0.0, 1.0
    verdict = separation(X, y, np.ones(3000))
    assert verdict.separated
    assert verdict.inexact == "too many columns"
    empty = {j: kind for j, kind in enumerate(verdict.coefficients) if kind != "finite"}
    assert empty[7] == "minus infinity"
    assert empty[9] == "plus infinity"
    expected = {j for j in range(1, 205) if len(set(y[levels == j].tolist())) == 1}
    assert set(empty) == expected
    assert verdict.rows.tolist() == np.isin(levels, list(expected)).tolist()


def test_records_separated_only_at_a_large_offset() -> None:
    X = np.column_stack([np.ones(12), np.repeat([0.0, 1.0], 6)])
    y = np.array([0, 1, 0, 1, 0, 0, 1, 1, 1, 1, 1, 1], dtype=float)
    for offset in (-1000.0, -50.0, 0.0, 30.0):
        fit = maximise(BinomialLikelihood(X, y, offset=np.where(X[:, 1] == 1.0, offset, 0.0)))
        assert fit.status == "no finite maximum"
        assert fit.separation is not None
        assert fit.separation.coefficients == ("finite", "plus infinity")


def test_a_search_that_does_not_settle_is_looked_into() -> None:
    # rounding in the score keeps the decrement above its bound for 80 steps
    X = [[1, 1, 0, 0], [1, 0, 1, 0], [1, 1, 0, 0], [1, 0, 1, 0], [1, 1, 1, 0], [1, 0, 1, 0], [1, 0, 1, 1], [1, 0, 0, 1]]
    X = np.array([*X, [1, 1, 1, 0], [1, 1, 1, 1], [1, 0, 1, 0]], dtype=float)
    y = np.array([0, 1, 0, 1, 0, 0, 0, 1, 0, 0, 0], dtype=float)
    fit = maximise(BinomialLikelihood(X, y))
    assert fit.status == "no finite maximum"
    assert fit.log_likelihood == pytest.approx(-4 * np.log(2), abs=1e-9)


def test_contrasts_of_separated_levels() -> None:
    # levels: reference 2/4, b 0/4, c 4/4, d 1/4: b - c falls, b - d falls, c - d rises, d is finite
    X = np.array([[1, 0, 0, 0], [1, 1, 0, 0], [1, 0, 1, 0], [1, 0, 0, 1]], dtype=float)
    verdict = separation(X, np.array([2.0, 0.0, 4.0, 1.0]), np.full(4, 4.0))
    assert verdict.coefficients == ("finite", "minus infinity", "plus infinity", "finite")
    contrasts = np.array([[0, 1, -1, 0], [0, 1, 0, -1], [0, 0, 1, -1], [0, 1, 1, 0], [0, 0, 0, 2]], dtype=float)
    signs = verdict.contrasts(contrasts)
    kinds = ["minus infinity", "minus infinity", "plus infinity", "undetermined", "finite"]
    assert [one.kind for one in signs] == kinds
    assert all(one.verified for one in signs)


def test_columns_that_are_combinations_of_others_are_undetermined() -> None:
    X = np.array([[1, 0, 1], [1, 0, 1], [1, 1, 0], [1, 1, 0]], dtype=float)
    verdict = separation(X, np.array([0.0, 1.0, 0.0, 1.0]), np.ones(4))
    assert not verdict.separated
    assert verdict.coefficients == ("undetermined",) * 3


@pytest.mark.parametrize(
    ("differences", "separated", "coefficients"),
    [
        # matched pairs, case less control, one exposure: discordant both ways
        ([[1], [-1], [1], [0]], False, ("finite",)),
        # the case exposed whenever the pair is discordant
        ([[1], [1], [0]], True, ("plus infinity",)),
        # concordant pairs only: nothing depends on the coefficient
        ([[0], [0]], False, ("undetermined",)),
        # a second column discordant both ways where the first is concordant: its coefficient is finite
        ([[1, 0], [1, 1], [0, 1], [0, -1]], True, ("plus infinity", "finite")),
        # neither column alone, but their sum is never smaller in the case
        ([[2, -1], [-1, 2], [1, -1], [-1, 1]], True, ("plus infinity", "plus infinity")),
        ([[1, 2], [1, -2]], True, ("plus infinity", "undetermined")),
        ([[2, -1], [-1, 2], [-1, -1]], False, ("finite", "finite")),
    ],
)
def test_differences_within_matched_sets(
    differences: list[list[int]], separated: bool, coefficients: tuple[str, ...]
) -> None:
    D = np.array(differences, dtype=float)
    verdict = separation_of_differences(D)
    assert verdict.separated is separated
    assert verdict.coefficients == coefficients
    assert verdict.rows.tolist() == [bool(separated and one) for one in (D @ verdict.direction > 0).tolist()]
    # a difference is a row with the outcome
    assert_proved(verdict, D, np.ones(len(D)), np.ones(len(D)))


def test_numbers_that_are_not_finite_are_refused() -> None:
    with pytest.raises(ValueError, match="finite"):
        separation(np.array([[1.0, np.nan]]), np.ones(1), np.ones(1))
    with pytest.raises(ValueError, match="finite"):
        separation_of_differences(np.array([[1.0, np.inf]]))
