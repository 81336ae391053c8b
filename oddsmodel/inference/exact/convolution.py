"""Partial sums of the columns and the number of outcomes behind each, row by row."""

from __future__ import annotations

from math import prod

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.exact.arithmetic import Arithmetic
from oddsmodel.inference.exact.bounds import Rest
from oddsmodel.inference.exact.budget import Meter
from oddsmodel.inference.exact.rows import Rows
from oddsmodel.inference.exact.whole_numbers import Whole
from oddsmodel.likelihood.base import Array

Index = NDArray[np.intp]

LARGEST_KEY = 2**62
TABLE_FROM, TABLE_FACTOR = 65_536, 16
BLOCK = 32_768


class TooManyValues(ArithmeticError):
    """The sums held fixed have more possible values than a key has room for."""


class Front:
    """The rows before `done`, as the sums that they may have and the number of outcomes for each.

    sums (k, 1 + q): the events in the present stratum, and the sums of the q nuisance columns; interest (t,): sums of
    the column of interest; weight (k, t): numbers of outcomes with both, in the given arithmetic.

    A row with n trials and columns x adds to each sum y·x for y = 0, ..., n events, in C(n, y) ways, and equal sums are
    joined: the multivariate shift algorithm of Hirji, Mehta & Patel 1987, JASA 82:1110-1117. Sums from which the other
    rows cannot reach the observed ones are left out, judged by the least and the greatest sum of the rest given the
    events left in the stratum, the shortest and longest paths of the network of Mehta & Patel 1995, Statistics in
    Medicine 14:2143-2160.
    """

    def __init__(self, rows: Rows, arithmetic: Arithmetic, meter: Meter) -> None:
        self.rows, self.arithmetic, self.meter = rows, arithmetic, meter
        self.rest = Rest(rows)
        self.done = 0
        self.sums = np.zeros((1, 1 + rows.nuisance.shape[1]), dtype=np.int64)
        self.interest = np.zeros(1, dtype=np.int64)
        self.weight = np.full((1, 1), arithmetic.one)

    def effort(self) -> float:
        """About what the next row costs."""
        if self.done == len(self.rows.trials):
            return np.inf
        return float(self.weight.size) * (1.0 + float(self.rows.trials[self.done]))

    def step(self) -> None:
        """Work off the next row."""
        row = self.done
        trials = int(self.rows.trials[row])
        moved, places, sums = self._moved(row, trials)
        shift = int(self.rows.interest[row])
        interest = self.interest
        if shift:
            interest = np.unique(interest[:, None] + shift * np.arange(trials + 1))
        states = len(sums) * len(interest)
        self.meter.hold(states, 8 * (states + self.weight.size + sums.size * (trials + 2)))
        weight = np.full((len(sums), len(interest)), self.arithmetic.none)
        for y, ways in enumerate(self.arithmetic.binomial(trials).tolist()):
            columns = np.searchsorted(interest, self.interest + y * shift)
            self._add(weight, places[y], columns, moved[y], ways)
        self.sums, self.interest, self.weight = sums, interest, weight
        self.done += 1

    def _moved(self, row: int, trials: int) -> tuple[list[Index], list[Index], Whole]:
        """For each number of events the sums that move, the place each moves to, and the new sums."""
        rows, stratum = self.rows, int(self.rows.stratum[row])
        step = np.concatenate([[int(rows.totals_fixed)], rows.nuisance[row]])
        events = int(rows.stratum_events[stratum])
        left = self.rest.trials_left(row + 1, stratum)
        reach = self.rest.reach(row + 1, stratum)
        low = np.concatenate([[events - left if rows.totals_fixed else 0], rows.total - reach.greatest.max(axis=1)])
        high = np.concatenate([[events if rows.totals_fixed else 0], rows.total - reach.least.min(axis=1)])
        low = np.maximum(low, self.sums.min(axis=0) + np.minimum(0, trials * step))
        high = np.minimum(high, self.sums.max(axis=0) + np.maximum(0, trials * step))
        stride, size = strides(low, high)

        moved, keys, number = [], [], 0
        for y in range(trials + 1):
            new = self.sums + y * step
            inside = np.flatnonzero(((new >= low) & (new <= high)).all(axis=1))
            moved.append(inside)
            keys.append((new[inside] - low) @ stride)
            number += len(inside)
            self.meter.hold(self.weight.size, 8 * (self.weight.size + 3 * number))
        self.meter.hold(self.weight.size, 8 * (self.weight.size + 3 * number) + 9 * _table_size(size, number))
        found, places = _distinct(keys, size)
        sums = np.empty((len(found), len(stride)), dtype=np.int64)
        rest = found
        for d in range(len(stride)):
            sums[:, d], rest = np.divmod(rest, stride[d])
        sums += low

        events_left = events - sums[:, 0] if rows.totals_fixed else np.zeros(len(sums), dtype=np.int64)
        missing = rows.total - sums[:, 1:]
        possible = (missing >= reach.least.T[events_left]) & (missing <= reach.greatest.T[events_left])
        alive = np.asarray(possible.all(axis=1))
        renumbered = np.cumsum(alive) - 1
        for y, place in enumerate(places):
            kept = alive[place]
            moved[y], places[y] = moved[y][kept], renumbered[place[kept]]
        sums = sums[alive]
        if not left:
            sums[:, 0] = 0
        return moved, places, sums

    def _add(self, weight: Array, places: Index, columns: Index, moved: Index, ways: float) -> None:
        """Add the moved weights, times `ways`, to their places, a block of rows at a time."""
        add, multiply = self.arithmetic.add, self.arithmetic.multiply
        first, width = int(columns[0]), len(columns)
        together = int(columns[-1]) - first + 1 == width
        height = max(1, BLOCK // width)
        for start in range(0, len(moved), height):
            here, there = moved[start : start + height], places[start : start + height]
            added = multiply(self.weight[here], ways)
            if together:
                weight[there, first : first + width] = add(weight[there, first : first + width], added)
            else:
                weight[there[:, None], columns] = add(weight[there[:, None], columns], added)
        self.meter.look()


def strides(low: Whole, high: Whole) -> tuple[Whole, int]:
    """Factors (d,) that make one key below a size of numbers (d,) between low and high: (numbers - low)'factors."""
    box = [int(size) for size in high - low + 1]
    if prod(box) > LARGEST_KEY:
        raise TooManyValues
    return np.array([prod(box[d + 1 :]) for d in range(len(box))], dtype=np.int64), prod(box)


def _table_size(size: int, number: int) -> int:
    """The size of a table of all keys below `size`, where it is not much larger than their number; else 0."""
    return size if size <= max(TABLE_FROM, TABLE_FACTOR * number) else 0


def _distinct(keys: list[Whole], size: int) -> tuple[Whole, list[Index]]:
    """The distinct keys of several arrays, all below `size`, in order; and the place of each key among them."""
    if _table_size(size, sum(map(len, keys))):
        present = np.zeros(size, dtype=np.bool_)
        for some in keys:
            present[some] = True
        found = np.flatnonzero(present)
        table = np.empty(size, dtype=np.intp)
        table[found] = np.arange(len(found))
        return found, [table[some] for some in keys]
    found = np.unique(np.concatenate(keys))
    return found, [np.searchsorted(found, some) for some in keys]
