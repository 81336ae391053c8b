"""Whole-number arithmetic against fractions: signs, null spaces, equations and non-negative combinations."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.inference.rational import as_floats, coprime, rounded, signs, whole_row
from oddsmodel.inference.rational_program import combination
from oddsmodel.inference.row_space import PRIMES, RowSpace, solved

numbers = st.floats(allow_nan=False, allow_infinity=False)


def _exact(row: np.ndarray, direction: list[int]) -> Fraction:
    return sum((Fraction(float(x)) * v for x, v in zip(row, direction, strict=True)), Fraction(0))


@settings(deadline=None, derandomize=True, max_examples=200)
@given(
    st.lists(st.lists(numbers, min_size=3, max_size=3), min_size=1, max_size=6),
    st.lists(st.integers(-(2**70), 2**70), min_size=3, max_size=3),
)
def test_signs_of_any_floats_are_those_of_fractions(rows: list[list[float]], direction: list[int]) -> None:
    X = np.array(rows)
    expected = [(value > 0) - (value < 0) for value in (_exact(row, direction) for row in X)]
    assert signs(X, direction).tolist() == expected


def test_signs_of_sums_that_cancel() -> None:
    # 0.1 + 0.2 - 0.3 is not zero in floats, three tenths of a tenth is; each row with exact zeros beside it
    tenth = 0.1
    X = np.array([[0.1, 0.2, 0.3], [tenth, 2 * tenth, 2 * tenth], [1e300, 1e284, 1e300], [3.0, 5.0, 4.0]])
    direction = [1, 1, -1]
    assert signs(X, direction).tolist() == [np.sign(_exact(row, direction)) for row in X]
    assert signs(np.array([[0.1, 0.3]]), [3, -1]).tolist() == [1]
    assert signs(np.tile([1.5, -0.25], (70_000, 1)), [1, 6]).tolist() == [0] * 70_000
    assert signs(np.zeros((0, 2)), [1, 1]).size == 0


@settings(deadline=None, derandomize=True, max_examples=100)
@given(st.lists(numbers, min_size=1, max_size=5))
def test_whole_rows_have_the_ratios_of_their_floats(row: list[float]) -> None:
    whole, factor = whole_row(np.array(row))
    assert factor > 0
    assert [Fraction(one) for one in whole] == [factor * Fraction(x) for x in row]


def test_rounding_and_scaling() -> None:
    assert coprime([Fraction(2, 3), Fraction(-4, 5), Fraction(0)]) == [5, -6, 0]
    assert as_floats([-(2**80), 2**79, 0]).tolist() == [-0.5, 0.25, 0.0]
    third = rounded(Fraction(10**40, 3), 12)
    assert abs(third / Fraction(10**40, 3) - 1) < Fraction(1, 2**11)
    assert rounded(Fraction(0), 12) == 0


@pytest.mark.parametrize(("rows", "columns"), [(1, 3), (3, 3), (4, 6), (12, 5), (0, 2)])
def test_null_spaces(rows: int, columns: int) -> None:
    rng = np.random.default_rng(rows + 10 * columns)
    for rank in range(min(rows, columns) + 1):
        left = rng.integers(-5, 6, (rows, rank)).astype(object)
        matrix = left @ rng.integers(-9, 10, (rank, columns)).astype(object)
        space = RowSpace(columns, [[int(x) for x in row] for row in matrix])
        plain = np.array(matrix, dtype=float)
        true_rank = np.linalg.matrix_rank(plain) if rows else 0
        assert len(space.pivots) == true_rank
        assert sorted([*space.pivots, *space.free]) == list(range(columns))
        # a pivot adds to the rank of the columns before it
        for j in range(columns):
            before, upto = (np.linalg.matrix_rank(plain[:, :k]) if rows and k else 0 for k in (j, j + 1))
            assert (j in space.pivots) == (upto > before)
        basis = space.null_basis()
        assert len(basis) == columns - true_rank
        for direction in basis:
            assert not any(sum(a * b for a, b in zip(row, direction, strict=True)) for row in matrix.tolist())
        if basis:
            assert np.linalg.matrix_rank(np.array([as_floats(one) for one in basis])) == len(basis)


def test_equations_of_floats_are_solved_exactly() -> None:
    rng = np.random.default_rng(1)
    for size in (1, 4, 25):
        vectors = [whole_row(row)[0] for row in rng.normal(size=(size, size))]
        weights = [Fraction(a, int(rng.integers(1, 99))) for a in rng.integers(-99, 99, size).tolist()]
        target = [sum(w * v[k] for w, v in zip(weights, vectors, strict=True)) for k in range(size)]
        assert solved(vectors, target) == weights
        fractions = solved(vectors, [Fraction(1)] * size)
        assert fractions is not None
        for k in range(size):
            assert sum(w * v[k] for w, v in zip(fractions, vectors, strict=True)) == 1
    assert solved([[1, 2], [2, 4]], [Fraction(1), Fraction(2)]) is None
    assert solved([[1, 2]], [Fraction(1), Fraction(3)]) is None
    assert solved([[1, 2]], [Fraction(1, 7), Fraction(2, 7)]) == [Fraction(1, 7)]


def test_numbers_that_vanish_modulo_a_prime() -> None:
    prime = PRIMES[0]
    space = RowSpace(2, [[prime, 1], [2 * prime, 1]])
    assert space.pivots == [0, 1]
    assert solved([[prime, 0], [0, 1]], [Fraction(1), Fraction(1)]) == [Fraction(1, prime), Fraction(1)]


def test_combinations_and_the_directions_that_rule_them_out() -> None:
    # Farkas: exactly one of the two, each checked here
    rng = np.random.default_rng(5)
    seen = {True: 0, False: 0}
    for _ in range(300):
        size, number = int(rng.integers(1, 5)), int(rng.integers(1, 8))
        vectors = [[int(x) for x in row] for row in rng.integers(-3, 4, (number, size))]
        target = [int(x) for x in rng.integers(-3, 4, size)]
        weights, direction = combination(vectors, target)
        assert (weights is None) != (direction is None)
        seen[direction is None] += 1
        if weights is not None:
            assert all(one >= 0 for one in weights)
            for k in range(size):
                assert sum((w * v[k] for w, v in zip(weights, vectors, strict=True)), Fraction(0)) == target[k]
        else:
            assert direction is not None
            assert all(sum(a * b for a, b in zip(v, direction, strict=True)) >= 0 for v in vectors)
            assert sum(a * b for a, b in zip(target, direction, strict=True)) < 0
    assert min(seen.values()) > 50
