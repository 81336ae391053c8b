"""The rows of an exact calculation: patterns with whole numbers, their strata, and the sums that are held fixed."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import permutations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.exact.whole_numbers import LARGEST, ManyValuedColumn, Whole, whole_numbers
from oddsmodel.likelihood.base import Array

MOST_PERMUTED = 4
MOST_CUTS = 12


@dataclass(frozen=True)
class Rows:
    """m patterns in the order in which they are worked off, those of one stratum together.

    nuisance (m, q), interest (m,): whole numbers, gauged to be small; trials (m,). total (q,): the observed sums of
    nuisance times events; observed: that of interest times events. stratum (m,): whole numbers; stratum_events: the
    events of each stratum, which are fixed too unless `totals_fixed` is False (a model without intercept).
    """

    nuisance: Whole
    interest: Whole
    trials: Whole
    total: Whole
    observed: int
    stratum: Whole
    stratum_events: Whole
    totals_fixed: bool

    def reversed(self) -> Rows:
        """The same rows from the last to the first."""
        return replace(
            self,
            nuisance=self.nuisance[::-1],
            interest=self.interest[::-1],
            trials=self.trials[::-1],
            stratum=self.stratum[::-1],
        )


@dataclass(frozen=True)
class Prepared:
    """rows; units (k,) of the k columns of interest. Their sums, less the least ones possible (k,), are the digits of
    the sum of rows.interest in the mixed base radix (k,)."""

    rows: Rows
    units: Array
    radix: Whole
    least: Whole

    def apart(self, sums: Whole) -> Whole:
        """Sums of the k columns (s, k), in their units, from sums (s,) of the one column made of them."""
        rest = sums - int(self.least @ self.radix)
        digits = np.empty((len(sums), len(self.radix)), dtype=np.int64)
        for j in range(len(self.radix))[::-1]:
            digits[:, j], rest = np.divmod(rest, self.radix[j])
        return digits + self.least


def prepare(
    X: Array, events: Array, trials: Array, positions: Sequence[int], strata: NDArray[np.generic] | None
) -> Prepared:
    """Whole numbers, small ones, in a good order; see `conditional_distribution` for the arguments.

    Within a stratum (all rows, where a constant is among the nuisance columns) adding a constant to a column changes
    its sum by a known number, so that every column is measured from its least value there. Strata in which all or none
    had the event have only one possible outcome and are left out.
    """
    X, events, trials = _checked(X, events, trials)
    if strata is not None and np.shape(strata) != events.shape:
        raise ValueError("strata must be (m,)")
    nuisance = [j for j in range(X.shape[1]) if j not in positions]
    constant = (X[:1] == X).all(axis=0) & (X[0] != 0.0)
    totals_fixed = strata is not None or bool(constant[nuisance].any())
    stratum = np.zeros(len(X), dtype=np.int64)
    if strata is not None:
        stratum = np.unique(np.asarray(strata), return_inverse=True)[1].reshape(-1).astype(np.int64)

    known = trials > 0
    if totals_fixed:
        stratum_trials = np.bincount(stratum, weights=trials)
        stratum_events = np.bincount(stratum, weights=events)
        mixed = (stratum_events > 0) & (stratum_events < stratum_trials)
        known &= mixed[stratum]
    X, stratum = X[known], stratum[known]
    y, n = events[known].astype(np.int64), trials[known].astype(np.int64)

    units = np.ones(len(positions))
    whole = np.zeros(X.shape, dtype=np.int64)
    for j in range(X.shape[1]):
        whole[:, j], unit = _gauged(X[:, j], n, stratum, totals_fixed, j)
        if j in positions:
            units[list(positions).index(j)] = unit
    of_interest = whole[:, list(positions)]
    radix = _radix(of_interest, n, positions)
    interest = of_interest @ radix
    held = whole[:, nuisance]
    held = np.unique(held[:, held.any(axis=0)], axis=1) if len(X) else held[:, :0]
    rows = _collapsed(held, interest, y, n, stratum, totals_fixed)
    return Prepared(rows, units, radix, n @ np.minimum(of_interest, 0))


def _checked(X: Array, events: Array, trials: Array) -> tuple[Array, Array, Array]:
    X = np.asarray(X, dtype=np.float64)
    events, trials = np.asarray(events, dtype=np.float64), np.asarray(trials, dtype=np.float64)
    if X.ndim != 2 or not len(X) or events.shape != (len(X),) or trials.shape != (len(X),):
        raise ValueError("X must be (m, p), events and trials (m,), m at least 1")
    if not np.isfinite(X).all():
        raise ValueError("X must hold finite numbers")
    if not ((events == np.rint(events)) & (trials == np.rint(trials)) & (events >= 0) & (events <= trials)).all():
        raise ValueError("events and trials must be whole numbers with 0 <= events <= trials")
    return X, events, trials


def _gauged(values: Array, trials: Whole, stratum: Whole, totals_fixed: bool, column: int) -> tuple[Whole, float]:
    """The column as small whole numbers, least value zero in each stratum where totals are fixed, and their unit."""
    if not values.any() or (totals_fixed and _constant_within(values, stratum)):
        return np.zeros(values.shape, dtype=np.int64), 1.0
    found = whole_numbers(values, from_zero=not totals_fixed)
    if found is None:
        raise ManyValuedColumn(column)
    whole, unit = found
    if totals_fixed:
        least = np.full(int(stratum.max()) + 1, np.iinfo(np.int64).max)
        np.minimum.at(least, stratum, whole)
        whole = whole - least[stratum]
    divisor = int(np.gcd.reduce(whole))
    if divisor > 1:
        whole, unit = whole // divisor, unit * divisor
    if float(np.abs(whole).astype(np.float64) @ trials) > LARGEST:
        raise ManyValuedColumn(column)
    return whole, unit


def _constant_within(values: Array, stratum: Whole) -> bool:
    order = np.lexsort([values, stratum])
    return not ((np.diff(stratum[order]) == 0) & (np.diff(values[order]) != 0)).any()


def _radix(whole: Whole, trials: Whole, positions: Sequence[int]) -> Whole:
    """Factors (k,) with which the sums of k columns become one sum that tells them all apart.

    A sum of one column lies between its least and its greatest possible value; the next factor is beyond their
    difference, so that the whole is a number in a mixed base.
    """
    radix = np.ones(whole.shape[1], dtype=np.int64)
    size = 1
    for j, position in enumerate(positions):
        radix[j] = size
        size *= int(np.abs(whole[:, j]) @ trials) + 1
        if size > LARGEST:
            raise ManyValuedColumn(position)
    return radix


def _collapsed(held: Whole, interest: Whole, y: Whole, n: Whole, stratum: Whole, totals_fixed: bool) -> Rows:
    """Equal rows of one stratum as one row, all rows in the order of `_order`."""
    total, observed = y @ held, int(y @ interest)
    stratum_events = np.bincount(stratum, weights=y).astype(np.int64) if len(y) else np.zeros(0, dtype=np.int64)
    if not len(y):
        return Rows(held, interest, n, total, observed, stratum, stratum_events, totals_fixed)
    table, index = np.unique(np.column_stack([stratum, held, interest]), axis=0, return_inverse=True)
    trials = np.bincount(index.reshape(-1), weights=n).astype(np.int64)
    if table[-1, 0] == table[0, 0]:
        order = _order(table[:, 1:], trials)
        table, trials = table[order], trials[order]
    return Rows(table[:, 1:-1], table[:, -1], trials, total, observed, table[:, 0], stratum_events, totals_fixed)


def _order(columns: Whole, trials: Whole) -> NDArray[np.intp]:
    """The order of the rows, sorted by one column, then another, that promises the fewest states.

    columns (m, q + 1): the nuisance columns, then that of interest. At each cut the states are about as many as the
    product of the spreads of the columns on one side of the cut, the sums of distances from the median.
    """
    q = columns.shape[1] - 1
    by_spread = tuple(sorted(range(q), key=lambda j: (-_spread(columns[:, j], trials), j)))
    if q <= MOST_PERMUTED:
        choices = list(permutations(range(q)))
    else:
        choices = [by_spread, by_spread[::-1], *((j, *(i for i in by_spread if i != j)) for j in range(q))]
    best, best_cost = np.arange(len(columns)), np.inf
    for choice in choices:
        order = np.lexsort([columns[:, j] for j in (*choice, q)[::-1]])
        cost = _cost(columns[order], trials[order])
        if cost < best_cost:
            best, best_cost = order, cost
    return best


def _cost(columns: Whole, trials: Whole) -> float:
    last = len(columns) - 1
    cost = 0.0
    for cut in np.unique(np.linspace(1, last, min(MOST_CUTS, last)).astype(int)):
        size = 1.0 + min(int(trials[:cut].sum()), int(trials[cut:].sum()))
        for j in range(columns.shape[1]):
            size *= 1.0 + min(_spread(columns[:cut, j], trials[:cut]), _spread(columns[cut:, j], trials[cut:]))
        cost += size
    return cost


def _spread(values: Whole, trials: Whole) -> float:
    """Sum of the distances from the median, each value counted as often as it has trials."""
    order = np.argsort(values, kind="stable")
    middle = np.searchsorted(np.cumsum(trials[order]), trials.sum() / 2.0)
    return float(np.abs(values - values[order[min(int(middle), len(values) - 1)]]) @ trials)
