"""Powers of a number and their pairs as columns of a matrix: the functions called fractional polynomials."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations_with_replacement

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.spread import Spread
from oddsmodel.likelihood.binomial import Moved
from oddsmodel.model.fitted import Array
from oddsmodel.passes import LEAF_ROWS, Leaf

POWERS = (-2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 2.0, 3.0)
"""Royston & Altman 1994, section 2; the power 0 stands for the logarithm."""

PAIRS = tuple(combinations_with_replacement(range(len(POWERS)), 2))
"""The pairs of degree two by their places among the powers; a power twice stands for x^p and x^p log x."""

LINE = POWERS.index(1.0)

COUNTS = 100.0
"""Whole numbers whose middle nine tenths range no further than this are raised by whole units of 1."""

ALIKE = 1e-6
"""A function of which less than this part is its own, beside another one and the constant, is none to be fitted."""

MOST_VALUES = 4096
"""Of more values than this, so many quantiles serve to standardise the functions, on which no fit depends."""

WIDEST = 1e15
"""Largest value by the smallest, beyond which powers cannot be worked with."""


@dataclass(frozen=True, slots=True)
class Origin:
    """z = (x + shift) / scale, positive for every record.

    shift: 0 where all values are positive; else it brings the smallest value to between half of a unit and one and a
    half. The unit is 1, 2 or 5 times a power of ten, at least a tenth of the range of the middle nine tenths of the
    records; for whole numbers it is 1 up to a range of 100, so that counts from 0 on are raised by 1. (Royston & Altman
    1994 raise by the smallest difference of two values, which for measurements can be next to nothing and lets the
    smallest value rule the fit.) scale: a power of ten, which changes no fit. least: half of the smallest z.
    """

    shift: float
    scale: float
    least: float

    def of(self, x: Array) -> Array:
        # Values may have been rounded to find the smallest.
        return np.asarray(np.maximum((x + self.shift) / self.scale, self.least))


def origin(spread: Spread) -> Origin | None:
    """The origin for the values of a column; None where these are too far apart for powers."""
    values = spread.values
    lower, middle, upper = spread.quantiles((0.05, 0.5, 0.95)).tolist()
    shift = 0.0
    if values[0] <= 0.0:
        unit = _unit((upper - lower) / 10.0 or (values[-1] - values[0]) / 10.0)
        if (values == np.rint(values)).all():
            unit = 1.0 if upper - lower <= COUNTS else max(1.0, unit)
        shift = float(f"{unit * math.ceil(0.5 - values[0] / unit):.12g}")
    if (values[-1] + shift) / (values[0] + shift) > WIDEST:
        return None
    scale = 10.0 ** math.floor(math.log10(middle + shift))
    return Origin(shift, scale, 0.5 * (float(values[0]) + shift) / scale)


def _unit(width: float) -> float:
    power = 10.0 ** math.floor(math.log10(width))
    return next(step * power for step in (1.0, 2.0, 5.0, 10.0) if step * power >= width * (1.0 - 1e-9))


@dataclass(frozen=True, eq=False)
class PowerColumns:
    """The functions of one column as columns of a matrix: 8 powers u_a, and v_ab for each of the pairs kept.

    means, lengths (16,): of z^p for the eight powers, then of z^p log z; u is what they standardise to. pairs: the
    places a, b in the 16 of each pair; v_ab = (u_b - slope u_a) / left is what b adds to a, slopes and left (k,).
    """

    origin: Origin
    means: Array
    lengths: Array
    pairs: tuple[tuple[int, int], ...]
    slopes: Array
    left: Array

    @property
    def number(self) -> int:
        return len(POWERS) + len(self.pairs)

    def of(self, x: Array) -> Array:
        """The columns (n, 8 + k) for values x (n,)."""
        u = (_functions(self.origin.of(x)) - self.means) / self.lengths
        return np.hstack([u[:, : len(POWERS)], u @ self._added])

    @cached_property
    def _added(self) -> Array:
        added = np.zeros((self.means.size, len(self.pairs)))
        for k, (first, second) in enumerate(self.pairs):
            added[second, k] += 1.0 / self.left[k]
            added[first, k] -= self.slopes[k] / self.left[k]
        return added

    def powers(self, pair: int) -> tuple[float, float]:
        first, second = self.pairs[pair]
        return POWERS[first], POWERS[second % len(POWERS)]


def power_columns(spread: Spread) -> PowerColumns | None:
    """The functions of a column, about standardised over the records; None where its values are no place for powers."""
    where = origin(spread)
    if where is None:
        return None
    some = spread.values.size > MOST_VALUES
    values = spread.quantiles(np.linspace(0.0, 1.0, MOST_VALUES)) if some else spread.values
    share = np.full(MOST_VALUES, 1.0 / MOST_VALUES) if some else spread.counts / spread.ends[-1]
    functions = _functions(where.of(values))
    means = share @ functions
    centred = functions - means
    lengths = np.sqrt(share @ centred**2)
    if not (lengths > 0.0).all():
        return None
    u = centred / lengths
    kept: list[tuple[int, int]] = []
    slopes: list[float] = []
    left: list[float] = []
    for first, second in PAIRS:
        place = second if second != first else len(POWERS) + first
        slope = float(share @ (u[:, first] * u[:, place]))
        own = u[:, place] - slope * u[:, first]
        length = math.sqrt(float(share @ own**2))
        if length >= ALIKE:
            kept.append((first, place))
            slopes.append(slope)
            left.append(length)
    return PowerColumns(where, means, lengths, tuple(kept), np.array(slopes), np.array(left)) if kept else None


def _functions(z: Array) -> Array:
    """z^p for the eight powers and z^p log z (n, 16) of positive z (n,)."""
    logarithm, root, inverse = np.log(z), np.sqrt(z), 1.0 / z
    found = np.empty((z.size, 2 * len(POWERS)))
    square = z * z
    for place, one in enumerate((inverse * inverse, inverse, 1.0 / root, logarithm, root, z, square, square * z)):
        found[:, place] = one
        np.multiply(one, logarithm, out=found[:, len(POWERS) + place])
    return found


@dataclass(frozen=True, eq=False)
class WithPowers:
    """Makes of rows: X of the other columns of the matrix, in working coordinates, and the powers of one after them."""

    others: tuple[int, ...]
    moved: Moved | None
    position: int
    powers: PowerColumns

    def __call__(self, rows: Leaf) -> Leaf:
        X = rows["X"]
        p = len(self.others)
        wide = np.empty((X.shape[0], p + self.powers.number))
        for first in range(0, X.shape[0], LEAF_ROWS):
            some = slice(first, first + LEAF_ROWS)
            other: NDArray[np.float64] = X[some].take(self.others, axis=1)
            wide[some, :p] = other if self.moved is None else self.moved.of(other)
            wide[some, p:] = self.powers.of(X[some, self.position])
        return {**rows, "X": wide}
