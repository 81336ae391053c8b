"""Standardised differences against the formulas written out and against a pseudo-inverse."""

from __future__ import annotations

import math

import numpy as np
import pytest

from oddsmodel.measures.standardised_difference import (
    standardised_difference_of_means,
    standardised_difference_of_shares,
)


def test_means_by_hand() -> None:
    # Austin 2009: (52 - 48) / sqrt((9 + 25) / 2).
    assert standardised_difference_of_means(52, 9, 48, 25) == pytest.approx(4 / math.sqrt(17))
    assert standardised_difference_of_means(1, 0, 1, 0) == 0.0
    assert standardised_difference_of_means(1, 0, 2, 0) is None


def test_two_levels_are_the_binary_formula() -> None:
    # Austin 2009: |p1 - p2| / sqrt((p1 q1 + p2 q2) / 2).
    found = standardised_difference_of_shares(np.array([0.7, 0.3]), np.array([0.5, 0.5]))
    assert found == pytest.approx(0.2 / math.sqrt((0.21 + 0.25) / 2))


def test_the_level_left_out_does_not_matter() -> None:
    random = np.random.default_rng(3)
    one, other = random.dirichlet(np.ones(5), size=2)
    found = standardised_difference_of_shares(one, other)
    assert standardised_difference_of_shares(one[::-1], other[::-1]) == pytest.approx(found)
    # Independent: the pseudo-inverse over all five levels gives the same quadratic form.
    spread = (np.diag(one) - np.outer(one, one) + np.diag(other) - np.outer(other, other)) / 2
    wanted = math.sqrt((one - other) @ np.linalg.pinv(spread) @ (one - other))
    assert found == pytest.approx(wanted, rel=1e-9)


def test_levels_nobody_has_are_left_out() -> None:
    found = standardised_difference_of_shares(np.array([0.0, 0.7, 0.3]), np.array([0.0, 0.5, 0.5]))
    assert found == standardised_difference_of_shares(np.array([0.7, 0.3]), np.array([0.5, 0.5]))
    assert standardised_difference_of_shares(np.array([1.0, 0.0]), np.array([1.0, 0.0])) == 0.0


def test_groups_told_apart_without_spread() -> None:
    assert standardised_difference_of_shares(np.array([1.0, 0.0]), np.array([0.0, 1.0])) is None
    assert standardised_difference_of_shares(np.array([1.0, 0.0, 0.0]), np.array([0.0, 0.5, 0.5])) is None
