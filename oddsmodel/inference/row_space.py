"""Exact solutions of linear equations in whole numbers, lifted from those modulo a prime."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import isqrt

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.rational import Whole, common_whole, coprime

Residues = NDArray[np.int64]

PRIMES = (2147483647, 2147483629, 2147483587)
"""Products of two residues fit into 64 bits. An unlucky prime makes rows look dependent: then the next is tried."""


@dataclass(frozen=True)
class _Echelon:
    """Independent rows, the columns of their pivots, and the inverse (r, r) of that square modulo a prime."""

    prime: int
    chosen: list[int]
    pivots: list[int]
    inverse: Residues


class RowSpace:
    """The span of rows of whole numbers.

    A pivot column is one that no combination of the columns before it gives on these rows; the others are free. The
    rank modulo a prime is at most the rank, so that rows found independent are so; rows found dependent are shown to
    be so by whoever checks that they are orthogonal to `null_basis`.
    """

    def __init__(self, columns: int, rows: Iterable[Whole] = ()) -> None:
        self.columns = columns
        self.rows: list[Whole] = list(rows)
        self._echelon = _reduced(self.rows, columns)

    def add(self, row: Whole) -> bool:
        """Add a row; whether it was outside the span so far."""
        rank = len(self.pivots)
        self.rows.append(row)
        self._echelon = _reduced(self.rows, self.columns)
        return len(self.pivots) > rank

    @property
    def pivots(self) -> list[int]:
        """The pivot columns, in order."""
        return self._echelon.pivots

    @property
    def free(self) -> list[int]:
        """The other columns, in order."""
        pivots = set(self.pivots)
        return [j for j in range(self.columns) if j not in pivots]

    def orthogonal(self, values: Sequence[Fraction]) -> Whole:
        """The direction orthogonal to every row that has these values in the free columns, up to a positive factor."""
        free, echelon = self.free, self._echelon
        *whole, unity = common_whole([*values, Fraction(1)])
        rows = [self.rows[k] for k in echelon.chosen]
        target = [-sum(row[j] * one for j, one in zip(free, whole, strict=True) if one) for row in rows]
        direction = [Fraction(0)] * self.columns
        for j, one in zip(free, whole, strict=True):
            direction[j] = Fraction(one, unity)
        found = _lifted([[row[j] for j in echelon.pivots] for row in rows], target, echelon)
        for j, value in zip(echelon.pivots, found, strict=True):
            direction[j] = value / unity
        return coprime(direction)

    def null_basis(self) -> list[Whole]:
        """A basis of the directions orthogonal to every row, one for each free column (positive there)."""
        d = len(self.free)
        return [self.orthogonal([Fraction(int(k == j)) for k in range(d)]) for j in range(d)]


def solved(vectors: Sequence[Whole], target: Sequence[Fraction]) -> list[Fraction] | None:
    """The weights with sum of weight * vector = target, for linearly independent vectors; None where there are none."""
    *whole, unity = common_whole([*target, Fraction(1)])
    size = len(vectors)
    equations = [list(one) for one in zip(*vectors, strict=True)]
    echelon = _reduced(equations, size)
    if len(echelon.pivots) < size:
        return None
    square = [equations[k] for k in echelon.chosen]
    found = _lifted(square, [whole[k] for k in echelon.chosen], echelon)
    *numerators, denominator = common_whole([*found, Fraction(1)])
    for equation, one in zip(equations, whole, strict=True):
        if sum(a * x for a, x in zip(equation, numerators, strict=True) if a) != one * denominator:
            return None
    return [one / unity for one in found]


def _reduced(rows: Sequence[Whole], columns: int) -> _Echelon:
    """Gaussian elimination modulo the first prime that finds all rows independent, else the most of them."""
    best: _Echelon | None = None
    for prime in PRIMES:
        left = np.array([[one % prime for one in row] for row in rows], dtype=np.int64).reshape(len(rows), columns)
        chosen, pivots = _pivots(left.copy(), prime)
        if best is None or len(pivots) > len(best.pivots):
            best = _Echelon(prime, chosen, pivots, _inverse(left[np.ix_(chosen, pivots)], prime))
        if len(pivots) == min(len(rows), columns):
            break
    assert best is not None
    return best


def _pivots(left: Residues, prime: int) -> tuple[list[int], list[int]]:
    order = np.arange(left.shape[0])
    pivots: list[int] = []
    for j in range(left.shape[1]):
        rank = len(pivots)
        below = np.flatnonzero(left[rank:, j])
        if below.size == 0:
            continue
        k = rank + int(below[0])
        left[[rank, k]], order[[rank, k]] = left[[k, rank]], order[[k, rank]]
        line = left[rank] * pow(int(left[rank, j]), -1, prime) % prime
        under = rank + 1 + np.flatnonzero(left[rank + 1 :, j])
        left[under] = (left[under] - left[under, j][:, None] * line % prime) % prime
        pivots.append(j)
    return order[: len(pivots)].tolist(), pivots


def _inverse(square: Residues, prime: int) -> Residues:
    """The inverse of a square known to be regular modulo a prime (Gauss and Jordan)."""
    size = square.shape[0]
    left = np.concatenate([square, np.eye(size, dtype=np.int64)], axis=1)
    for j in range(size):
        k = j + int(np.flatnonzero(left[j:, j])[0])
        left[[j, k]] = left[[k, j]]
        left[j] = left[j] * pow(int(left[j, j]), -1, prime) % prime
        others = np.flatnonzero(left[:, j])
        others = others[others != j]
        left[others] = (left[others] - left[others, j][:, None] * left[j] % prime) % prime
    return left[:, size:]


def _lifted(square: Sequence[Whole], target: Sequence[int], echelon: _Echelon) -> list[Fraction]:
    """The solution of a regular square of equations (Dixon 1982, Numerische Mathematik 40:137-141).

    Its digits to the base of the prime p come one after another, each from the inverse modulo p and the remainder so
    far. By Cramer's rule and Hadamard's bound, numerators and denominators stay below a known size; when the digits
    reach twice that, the fractions are the only ones (Wang 1981). Short fractions are found, and checked, before.
    """
    size, prime = len(target), echelon.prime
    if not any(target):
        return [Fraction(0)] * size
    root = size.bit_length() // 2 + 1
    bits = sum(max(abs(one) for one in row).bit_length() + root for row in square)
    bits += max(abs(one) for one in target).bit_length() + root
    last = (2 * bits + 2) // 30 + 2
    matrix = np.array(square, dtype=object).reshape(size, size)
    left = np.array(list(target), dtype=object)
    digits: list[Residues] = []
    check = 4
    while True:
        residues = np.array([one % prime for one in left], dtype=np.int64)
        digit = (echelon.inverse * residues % prime).sum(axis=1) % prime
        digits.append(digit)
        left = (left - matrix @ digit.astype(object)) // prime
        if len(digits) in (check, last):
            check *= 2
            found = _fractions(digits, prime)
            if found is not None and (len(digits) == last or _solves(square, target, found)):
                return found


def _fractions(digits: Sequence[Residues], prime: int) -> list[Fraction] | None:
    """The fractions of least size that have these digits; a denominator is carried on from one to the next."""
    values = [0] * digits[0].size
    for digit in reversed(digits):
        values = [value * prime + int(one) for value, one in zip(values, digit, strict=True)]
    modulus = prime ** len(digits)
    most = isqrt(modulus // 2)
    denominator = 1
    found = []
    for value in values:
        carried = value * denominator % modulus
        if carried > modulus - most:
            carried -= modulus
        if abs(carried) > most:
            above, below = _short(carried, modulus, most)
            carried, denominator = above, denominator * below
            if denominator > most:
                return None
        found.append(Fraction(carried, denominator))
    return found


def _short(value: int, modulus: int, most: int) -> tuple[int, int]:
    """The fraction equal to a value under a modulus with a numerator of at most this size (Euclid's algorithm)."""
    one, other = modulus, value
    before, now = 0, 1
    while other > most:
        quotient = one // other
        one, other = other, one - quotient * other
        before, now = now, before - quotient * now
    return (other, now) if now > 0 else (-other, -now)


def _solves(square: Sequence[Whole], target: Sequence[int], found: Sequence[Fraction]) -> bool:
    *numerators, denominator = common_whole([*found, Fraction(1)])
    return all(
        sum(a * x for a, x in zip(row, numerators, strict=True) if a) == one * denominator
        for row, one in zip(square, target, strict=True)
    )
