"""The exact conditional distribution of a column's sum over the events, given the sums of all other columns."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.exact.arithmetic import arithmetic
from oddsmodel.inference.exact.budget import Budget, Meter
from oddsmodel.inference.exact.convolution import BLOCK, Front, TooManyValues, strides
from oddsmodel.inference.exact.rows import Rows, prepare
from oddsmodel.inference.exact.whole_numbers import ManyValuedColumn, Whole
from oddsmodel.likelihood.base import Array
from oddsmodel.passes.work import products
from oddsmodel.progress import Progress, Silent


@dataclass(frozen=True, eq=False)
class ConditionalDistribution:
    """The values that k sums can take together, given all other sums, and the log of the number of outcomes of each.

    distance (s, k): each value less the observed one, in the units of the columns, in ascending order; log_weight (s,):
    with a probability proportional to exp(log_weight + distance'beta). place: that of the observed value. patterns:
    rows that were worked off; states: the most pairs of sums held at once.
    """

    distance: Array
    log_weight: Array
    place: int
    patterns: int
    states: int


def conditional_distribution(
    X: Array,
    events: Array,
    trials: Array,
    positions: Sequence[int],
    *,
    strata: NDArray[np.generic] | None = None,
    budget: Budget | None = None,
    progress: Progress | None = None,
) -> ConditionalDistribution:
    """The joint distribution of the sums of events times X[:, positions], given those of all other columns.

    X (m, p), events (m,) out of trials (m,): covariate patterns or records, in any order. strata (m,): labels; each
    stratum has an intercept of its own, whose sum is fixed too (matched sets).

    Given the sums of the other columns, the probability of t = X_j'y is proportional to c(t) exp(beta_j't), c(t) the
    number of outcomes with these sums (Cox 1970; Hirji, Mehta & Patel 1987). The rows are worked off from both ends,
    at whichever the next step costs less, and the ends are joined where they meet. Equal sums are found to be equal by
    whole numbers; see `whole_numbers`.

    Raises ManyValuedColumn, BeyondBudget; ValueError for arrays that do not fit.
    """
    known = set(range(X.shape[1]))
    if not positions or len(set(positions)) != len(positions) or not known.issuperset(positions):
        raise ValueError("positions must name different columns of X, at least one")
    progress = progress or Silent()
    prepared = prepare(X, events, trials, positions, strata)
    rows = prepared.rows
    progress.stage("counting outcomes", len(rows.trials))
    meter = Meter(budget or Budget(), len(rows.trials))
    try:
        sums, log_weight = _sums(rows, meter, progress)
    except TooManyValues:
        others = [j for j in range(X.shape[1]) if j not in positions]
        raise ManyValuedColumn(max(others, key=lambda j: len(np.unique(X[:, j])))) from None
    apart = prepared.apart(sums) - prepared.apart(np.array([rows.observed]))
    order = np.lexsort(apart.T[::-1])
    place = int(np.flatnonzero((apart[order] == 0).all(axis=1))[0])
    return ConditionalDistribution(
        apart[order] * prepared.units, log_weight[order], place, len(rows.trials), meter.most_states
    )


def _sums(rows: Rows, meter: Meter, progress: Progress) -> tuple[Whole, Array]:
    """The possible sums (s,) of the column of interest and the log of the number of outcomes of each."""
    m = len(rows.trials)
    held = arithmetic(rows)
    front, back = Front(rows, held, meter), Front(rows.reversed(), held, meter)
    while front.done + back.done < m:
        # Logarithms are joined only where the back has not set out: there nothing needs to be summed.
        first = held.logarithms or front.effort() <= back.effort()
        nearer, other = (front, back) if first else (back, front)
        meter.elsewhere = other.weight.nbytes
        nearer.step()
        meter.patterns_done += 1
        progress.advance()
    return _joined(front, back, meter)


def _joined(front: Front, back: Front, meter: Meter) -> tuple[Whole, Array]:
    rows, cut = front.rows, front.done
    within = 0 < cut < len(rows.trials) and rows.stratum[cut - 1] == rows.stratum[cut] and rows.totals_fixed
    whole = np.concatenate([[rows.stratum_events[rows.stratum[cut]] if within else 0], rows.total])
    missing = whole - back.sums
    low = np.minimum(front.sums.min(axis=0), missing.min(axis=0))
    stride, _ = strides(low, np.maximum(front.sums.max(axis=0), missing.max(axis=0)))
    _, here, there = np.intersect1d(
        (front.sums - low) @ stride, (missing - low) @ stride, assume_unique=True, return_indices=True
    )
    states = len(front.interest) * len(back.interest)
    meter.hold(states, 32 * states)
    sums = (front.interest[:, None] + back.interest).reshape(-1)
    if front.arithmetic.logarithms:
        log_weight = front.weight[here].reshape(-1)
    else:
        pairs = np.zeros((len(front.interest), len(back.interest)))
        # One thread: idle ones cost more than they bring, and the order of adding stays the same.
        with products().limit(limits=1, user_api="blas"):
            for start in range(0, len(here), BLOCK):
                some = slice(start, start + BLOCK)
                pairs += front.weight[here[some]].T @ back.weight[there[some]]
        sums, index = np.unique(sums, return_inverse=True)
        with np.errstate(divide="ignore"):
            log_weight = np.log(np.bincount(index.reshape(-1), weights=pairs.reshape(-1)))
    possible = log_weight > -np.inf
    return sums[possible], log_weight[possible]
