"""Covariate patterns against numpy's unique rows."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from oddsmodel.design import patterns
from oddsmodel.design.patterns import collapse


def holds(X: np.ndarray, event: np.ndarray, counts: np.ndarray | None) -> None:
    """Patterns are the unique rows (numpy.unique), in order of first appearance, with their sums."""
    found = collapse(X, event, counts)
    weight = np.ones(len(X)) if counts is None else counts
    _, first, inverse = np.unique(X + 0.0, axis=0, return_index=True, return_inverse=True)
    inverse = inverse.reshape(-1)
    assert found.X.shape[0] == first.size
    np.testing.assert_array_equal(found.first_row, np.sort(first))
    np.testing.assert_array_equal(found.X[found.index], X)
    np.testing.assert_array_equal(found.X, X[found.first_row])
    by_first = {int(row): place for place, row in enumerate(first)}
    for pattern, row in enumerate(found.first_row):
        members = inverse == by_first[int(row)]
        np.testing.assert_array_equal(found.index == pattern, members)
        assert found.trials[pattern] == weight[members].sum()
        assert found.events[pattern] == weight[members & event].sum()


numbers = st.sampled_from([0.0, -0.0, 1.0, -1.0, 2.0, 0.5, 1e-300, 1e300, 3.0000000000000004, 3.0])


@settings(deadline=None, derandomize=True, max_examples=150)
@given(st.data(), st.integers(1, 40), st.integers(1, 5))
def test_any_rows(data: st.DataObject, n: int, p: int) -> None:
    X = data.draw(arrays(np.float64, (n, p), elements=numbers))
    event = data.draw(arrays(np.bool_, n))
    counts = data.draw(st.none() | arrays(np.float64, n, elements=st.integers(0, 9).map(float)))
    holds(X, event, counts)


def test_indicators_of_many_columns() -> None:
    random = np.random.default_rng(1)
    X = np.column_stack([np.ones(3000), random.integers(0, 2, (3000, 16))]).astype(float)
    holds(X[:400], random.random(400) < 0.3, None)
    found = collapse(X, random.random(3000) < 0.3)
    assert found.trials.sum() == 3000
    assert found.trials.size < 3000


def test_the_matrix_is_kept_where_all_rows_differ() -> None:
    X = np.random.default_rng(1).normal(size=(1000, 3))
    found = collapse(X, np.zeros(1000, dtype=bool))
    assert found.X is X
    np.testing.assert_array_equal(found.index, np.arange(1000))
    np.testing.assert_array_equal(found.trials, 1.0)


@pytest.mark.parametrize("colliding", [1, 2])
def test_rows_that_share_a_hash(monkeypatch: pytest.MonkeyPatch, colliding: int) -> None:
    """With one hash that fails the second serves, and with none rows are sorted whole."""
    true = patterns.row_hashes

    def hashes(X: np.ndarray, attempt: int) -> np.ndarray:
        return true(X, attempt) % np.uint64(3) if attempt < colliding else true(X, attempt)

    monkeypatch.setattr(patterns, "row_hashes", hashes)
    random = np.random.default_rng(4)
    holds(random.integers(0, 4, (300, 3)).astype(float), random.random(300) < 0.5, None)


def test_hashes_of_small_numbers_do_not_meet() -> None:
    """Rows of small whole numbers, the hardest for a hash of floating-point bits, give as many hashes as rows."""
    grid = np.stack(np.meshgrid(*[np.arange(6.0)] * 7, indexing="ij"), axis=-1).reshape(-1, 7)
    for attempt in range(patterns.HASHES):
        assert np.unique(patterns.row_hashes(grid, attempt)).size == len(grid)


def test_no_rows() -> None:
    found = collapse(np.empty((0, 2)), np.empty(0, dtype=bool))
    assert found.X.shape == (0, 2)
    assert found.events.size == found.trials.size == 0
