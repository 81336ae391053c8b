"""Floats as whole numbers over a power of two, so that the signs of their sums can be exact."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from fractions import Fraction
from math import gcd, lcm

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array

Whole = list[int]
Signs = NDArray[np.int8]

EXACT_BELOW = float(2**53)
"""Sums of whole numbers whose absolute values add up to less are exact in double precision, in any order."""

EPSILON = float(np.finfo(np.float64).eps)


def whole_row(row: Array) -> tuple[Whole, Fraction]:
    """Coprime whole numbers with the ratios of a row of floats, and the positive factor: whole = factor * row."""
    pairs = [float(x).as_integer_ratio() for x in row]
    common = lcm(*(below for _, below in pairs))
    whole = [above * (common // below) for above, below in pairs]
    divisor = gcd(*whole) or 1
    return [one // divisor for one in whole], Fraction(common, divisor)


def common_whole(fractions: Iterable[Fraction]) -> Whole:
    """Fractions over their least common denominator: the numerators."""
    given = list(fractions)
    common = lcm(*(one.denominator for one in given))
    return [one.numerator * (common // one.denominator) for one in given]


def rounded(one: Fraction, bits: int) -> Fraction:
    """A fraction to so many significant bits."""
    if one == 0:
        return one
    unit = Fraction(2) ** (one.numerator.bit_length() - one.denominator.bit_length() - bits)
    return round(one / unit) * unit


def coprime(fractions: Iterable[Fraction]) -> Whole:
    """The shortest whole numbers with the ratios and signs of some fractions."""
    whole = common_whole(fractions)
    divisor = gcd(*whole) or 1
    return [one // divisor for one in whole]


def as_floats(direction: Sequence[int]) -> Array:
    """A direction of whole numbers as floats, scaled by a power of two so that its largest size is from 1/2 to 1."""
    bits = max((abs(one).bit_length() for one in direction), default=0)
    return np.array([float(Fraction(one, 1 << bits)) for one in direction], dtype=np.float64)


def product(row: Sequence[int], direction: Sequence[int]) -> int:
    """The inner product of two rows of whole numbers."""
    return sum(x * v for x, v in zip(row, direction, strict=True) if x and v)


def signs(X: Array, direction: Sequence[int]) -> Signs:
    """The exact signs (n,) of X v for rows of floats X (n, p) and a direction v of whole numbers.

    In double precision |fl(x'v) - x'v| <= (p + 3) eps sum |x_j| |v_j| (Higham 2002, section 3.1, with one rounding
    of each v_j), which settles the rows that are clearly off zero. The others are settled by whole numbers: in
    double precision where no sum can leave the range in which it is exact, else one by one.
    """
    support = [j for j, one in enumerate(direction) if one]
    if not support:
        return np.zeros(X.shape[0], dtype=np.int8)
    part = X if len(support) == X.shape[1] else X[:, support]
    chosen = [direction[j] for j in support]
    approximate = as_floats(chosen)
    with np.errstate(over="ignore", invalid="ignore", under="ignore"):
        values = part @ approximate
        reach = float(np.maximum(part.max(axis=0, initial=0.0), -part.min(axis=0, initial=0.0)) @ np.abs(approximate))
        found = np.sign(values).astype(np.int8)
        doubtful = ~(np.abs(values) > (len(support) + 3) * EPSILON * reach + len(support) * 1e-307)
    if float(np.abs(approximate).min()) < 1e-290:
        doubtful[:] = True
    if doubtful.any():
        found[doubtful] = _settled(part[doubtful], chosen)
    return found


def _settled(part: Array, direction: list[int]) -> Signs:
    """Exact signs of rows whose sum is zero or nearly so."""
    sizes = np.abs(part).max(axis=0)
    if all(abs(one) < EXACT_BELOW for one in direction):
        weights = np.array(direction, dtype=np.float64)
        for power in (1.0, 1024.0, 1048576.0):
            if not float(sizes @ np.abs(weights)) * power < EXACT_BELOW:
                break
            whole = part * power
            if (whole == np.rint(whole)).all():
                return np.sign(whole @ weights).astype(np.int8)
    distinct, which = np.unique(part, axis=0, return_inverse=True)
    exact = [product(whole_row(row)[0], direction) for row in distinct]
    return np.array([(one > 0) - (one < 0) for one in exact], dtype=np.int8)[which.reshape(-1)]
