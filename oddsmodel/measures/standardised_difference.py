"""Standardised differences between two groups: how unlike they are in one column, in standard deviations."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def standardised_difference_of_means(mean1: float, variance1: float, mean2: float, variance2: float) -> float | None:
    """|m1 − m2| / sqrt((s1² + s2²) / 2) (Austin 2009, Statistics in Medicine 28:3083, section 2).

    None where neither group has any spread and the means differ.

    >>> standardised_difference_of_means(10.0, 4.0, 11.0, 4.0)
    0.5
    """
    spread = math.sqrt((variance1 + variance2) / 2.0)
    if spread == 0.0:
        return 0.0 if mean1 == mean2 else None
    return abs(mean1 - mean2) / spread


def standardised_difference_of_shares(shares1: Array, shares2: Array) -> float | None:
    """sqrt((T − C)' S⁻¹ (T − C)) of the shares of all levels but one (Yang & Dalton 2012).

    shares1, shares2: the shares of the levels (k,) in either group, each adding up to 1. S is the mean of the two
    multinomial covariance matrices. With two levels it is |p1 − p2| / sqrt((p1 q1 + p2 q2) / 2) (Austin 2009).
    Levels that neither group has are left out. None where S is singular: some mixture of levels tells the groups
    apart without spread.
    """
    present = (shares1 > 0.0) | (shares2 > 0.0)
    one, other = shares1[present][1:], shares2[present][1:]

    # A single level: nothing can differ.
    if one.size == 0:
        return 0.0
    spread = (np.diag(one) - np.outer(one, one) + np.diag(other) - np.outer(other, other)) / 2.0
    if np.linalg.matrix_rank(spread, hermitian=True) < one.size:
        return None
    difference = one - other
    return math.sqrt(max(0.0, float(difference @ np.linalg.solve(spread, difference))))
