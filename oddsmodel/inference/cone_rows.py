"""Passes over signed rows: which of them a direction separates, and which of them stand against it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.rational import Signs, Whole, as_floats, signs
from oddsmodel.likelihood.base import Array
from oddsmodel.passes import Leaf


class Direction(Protocol):
    """A direction v (p,) of the coefficients."""

    @property
    def floats(self) -> Array:
        """v (p,) to double precision, scaled."""

    def signs(self, X: Array) -> Signs:
        """The signs of X v (n,)."""


@dataclass(frozen=True)
class ExactDirection:
    """A direction of whole numbers, whose signs are exact."""

    whole: tuple[int, ...]

    @property
    def floats(self) -> Array:
        return as_floats(self.whole)

    def signs(self, X: Array) -> Signs:
        return signs(X, self.whole)


@dataclass(frozen=True)
class RoundedDirection:
    """A direction in double precision; x'v of size `zero` or less counts as zero."""

    floats: Array
    zero: float

    def signs(self, X: Array) -> Signs:
        values = X @ self.floats
        return np.where(np.abs(values) <= self.zero, 0.0, np.sign(values)).astype(np.int8)


@dataclass(frozen=True)
class Chosen:
    """A few rows: X (m, p), sides (m,), numbers (m,) in the source."""

    X: Array
    sides: Signs
    numbers: NDArray[np.int64]


def sides_of(rows: Leaf) -> tuple[Signs, NDArray[np.bool_]]:
    """For each row, the sign that x'v must not contradict, and whether the row counts at all.

    1 for events only, -1 for none, 0 for both (x'v must be zero). A row without trials does not count. Rows without
    events are differences, whose x'v must not be negative.
    """
    if "events" not in rows:
        number = rows["X"].shape[0]
        return np.ones(number, dtype=np.int8), np.ones(number, dtype=bool)
    events, trials = rows["events"], rows.get("trials")
    all_events = events >= (1.0 if trials is None else trials)
    sides = all_events.astype(np.int8)
    sides -= events <= 0.0
    return sides, np.ones(events.shape, dtype=bool) if trials is None else trials > 0.0


def some_of_each(rows: Leaf, first: int, most: int) -> Chosen:
    """Work of a pass: at most so many rows of each side, evenly spaced."""
    sides, counted = sides_of(rows)
    parts = [_spaced(np.flatnonzero(counted & (sides == side)), most) for side in (-1, 0, 1)]
    return _chosen(rows, first, sides, np.concatenate(parts))


def against(rows: Leaf, first: int, state: tuple[Sequence[Direction], int]) -> Chosen:
    """Work of a pass: rows that contradict any of some directions, at most so many for each.

    Half of them are those that contradict it most, the others are evenly spaced.
    """
    directions, most = state
    X = rows["X"]
    sides, counted = sides_of(rows)
    parts = [np.zeros(0, dtype=np.intp)]
    for direction in directions:
        found = direction.signs(X)
        wrong = np.flatnonzero(counted & ((found * sides < 0) | ((sides == 0) & (found != 0))))
        if wrong.size > most:
            sizes = np.abs(X[wrong] @ direction.floats)
            half = most // 2
            largest = np.argpartition(sizes, wrong.size - half)[wrong.size - half :]
            wrong = np.concatenate([wrong[largest], _spaced(wrong, most - half)])
        parts.append(wrong)
    return _chosen(rows, first, sides, np.unique(np.concatenate(parts)))


def outside(rows: Leaf, first: int, state: tuple[Direction, Sequence[Direction], int]) -> Chosen:
    """Work of a pass: rows that a direction leaves at zero and that are not zero along some of the others."""
    direction, others, most = state
    X = rows["X"]
    sides, counted = sides_of(rows)
    left = np.flatnonzero(counted & (direction.signs(X) == 0))
    kept = X if left.size == X.shape[0] else X[left]
    parts = [np.zeros(0, dtype=np.intp)]
    for other in others:
        parts.append(left[_spaced(np.flatnonzero(other.signs(kept)), most)])
    return _chosen(rows, first, sides, np.unique(np.concatenate(parts)))


def moved(rows: Leaf, first: int, direction: Direction) -> tuple[NDArray[np.bool_], bool]:
    """Work of a pass: which rows (n,) a direction separates, and whether these are all that count."""
    _, counted = sides_of(rows)
    apart = (direction.signs(rows["X"]) != 0) & counted
    return apart, bool(apart.sum() == counted.sum())


def joined(parts: Sequence[Chosen]) -> Chosen:
    """Chosen rows of several tasks, one after another."""
    return Chosen(
        np.concatenate([part.X for part in parts]),
        np.concatenate([part.sides for part in parts]),
        np.concatenate([part.numbers for part in parts]),
    )


def exact(direction: Whole) -> ExactDirection:
    return ExactDirection(tuple(direction))


def _chosen(rows: Leaf, first: int, sides: Signs, which: NDArray[np.intp]) -> Chosen:
    return Chosen(np.array(rows["X"][which]), sides[which], which + first)


def _spaced(which: NDArray[np.intp], most: int) -> NDArray[np.intp]:
    if which.size <= most:
        return which
    return which[np.linspace(0, which.size - 1, most).astype(np.intp)]
