"""Separation against brute force and against what happens to the likelihood."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from oddsmodel.inference import maximise, separation
from oddsmodel.likelihood import BinomialLikelihood


def separated_by_brute_force(X: np.ndarray, y: np.ndarray) -> bool:
    """Albert & Anderson (1984): look through the directions orthogonal to p - 1 of the rows (integer data, p <= 3).

    The cone {v: z'v >= 0 for every signed row z} is pointed when X has full rank; it is not {0} exactly when it
    has an extreme ray, which is orthogonal to p - 1 independent rows.
    """
    signed = np.where(y[:, None] == 1, X, -X).astype(int)
    p = X.shape[1]
    for chosen in itertools.combinations(range(len(signed)), p - 1):
        rows = signed[list(chosen)]
        ray = np.array([-rows[0][1], rows[0][0]]) if p == 2 else np.cross(rows[0], rows[1])
        for v in (ray, -ray):
            if v.any() and (signed @ v >= 0).all():
                return True
    return False


@pytest.mark.parametrize("p", [2, 3])
def test_no_separated_data_set_slips_past(p: int) -> None:
    rng = np.random.default_rng(7 + p)
    seen = {True: 0, False: 0}
    for _ in range(400):
        n = int(rng.integers(p + 1, 14))
        X = np.column_stack([np.ones(n), rng.integers(-2, 3, size=(n, p - 1))]).astype(float)
        y = rng.integers(0, 2, size=n).astype(float)
        if np.linalg.matrix_rank(X) < p:
            continue
        expected = separated_by_brute_force(X, y)
        seen[expected] += 1
        assert separation(X, y, np.ones(n)).separated is expected
        fit = maximise(BinomialLikelihood(X, y))
        assert fit.status == ("no finite maximum" if expected else "converged")
    assert min(seen.values()) > 40


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
