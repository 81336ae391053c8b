"""The binomial likelihood of several data sets that are the same rows, each counted otherwise: weights, not copies."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array, Evaluation
from oddsmodel.likelihood.kernels import unpacked, weighted_products
from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import LEAF_ROWS, Leaf, Passes

Counts = NDArray[Any]
Index = NDArray[np.int64]

BLOCK_BYTES = 1 << 20
"""Rows are worked on in blocks whose values, for all members, take so many bytes."""

FEWEST_ROWS = 256


class ResampledLikelihood:
    """Log-likelihoods of k data sets (members) with the rows of one pass: bootstrap samples, folds, parts left out.

    events, trials (k, n): how many records of member j with the event, and in all, have row i, as whole numbers.
    Member j at beta (p,), its risk mu = 1 / (1 + exp(-X beta)):

        l(beta) = sum_i  events_ji eta_i - trials_ji log(1 + exp(eta_i)),

    without the binomial coefficients. The events, trials and offset that the pass itself holds are not looked at.
    """

    curvature: Literal["Hessian", "expected"] = "Hessian"
    concave = True

    def __init__(self, passes: Passes, parameters: int, events: Counts, trials: Counts) -> None:
        if events.shape != trials.shape or trials.shape[1:] != (passes.rows,):
            raise ValueError("events and trials must have a row for each member and a number for each row of the pass")
        self.passes, self.parameters = passes, parameters
        self.events, self.trials = _narrow(events), _narrow(trials)

    @property
    def members(self) -> int:
        return len(self.trials)

    @property
    def rows(self) -> int:
        return self.passes.rows

    def evaluate(self, beta: Array, *, member: Index | None = None, information: bool = True) -> Evaluation:
        """Values at beta (j, p) in one pass; member (j,) says whose each is, all of them in order where None."""
        chosen = np.arange(self.members) if member is None else member
        state = np.atleast_2d(beta), self.events[chosen], self.trials[chosen]
        total = _added(self.passes.each(_Values(information), state))
        lost = ~np.isfinite(total[0])
        value, score = np.where(lost, -np.inf, total[0]), np.where(lost[:, None], 0.0, total[1])
        if not information:
            return Evaluation(value, score, None)
        return Evaluation(value, score, np.where(lost[:, None, None], 0.0, total[2]))

    def grams(self) -> Array:
        """X'NX with each member's trials N on the diagonal (k, p, p): four times the largest information possible."""
        return _added(self.passes.each(_products, self.trials))[0]

    def linear(self, beta: Array) -> Array:
        """Linear predictors (j, n) of all rows at beta (j, p), whoever's they are."""
        return np.concatenate(list(self.passes.each(_linear, beta)), axis=1)


def _narrow(counts: Counts) -> Counts:
    """The counts in as few bytes as hold them."""
    return counts.astype(np.min_scalar_type(int(counts.max(initial=0))))


def _added(parts: Iterable[tuple[Array, ...]]) -> list[Array]:
    total: list[Array] = []
    for part in parts:
        total = [one + other for one, other in zip(total, part, strict=True)] if total else list(part)
    return total


def _linear(rows: Leaf, first: int, beta: Array) -> Array:
    return np.asarray(beta @ rows["X"].T)


def _products(rows: Leaf, first: int, trials: Counts) -> tuple[Array]:
    X = rows["X"]
    total = np.zeros((len(trials), X.shape[1], X.shape[1]))
    for start in range(0, len(X), LEAF_ROWS):
        block = X[start : start + LEAF_ROWS]
        weight = trials[:, first + start : first + start + len(block)].astype(np.float64)
        total += unpacked(weighted_products(block[None], weight[None])[0], X.shape[1])
    return (total,)


@dataclass(frozen=True)
class _Values:
    """Log-likelihoods, scores and, where asked, informations of the rows of a task."""

    information: bool

    def __call__(self, rows: Leaf, first: int, state: tuple[Array, Counts, Counts]) -> tuple[Array, ...]:
        beta, events, trials = state
        members, p = beta.shape
        value, score = np.zeros(members), np.zeros(beta.shape)
        products = np.zeros((members, p, p))
        step = min(LEAF_ROWS, max(FEWEST_ROWS, BLOCK_BYTES // (8 * max(1, members))))
        for start in range(0, len(rows["X"]), step):
            X = rows["X"][start : start + step]
            place = slice(first + start, first + start + len(X))
            happened, counted = events[:, place], trials[:, place]
            with np.errstate(over="ignore", invalid="ignore"):
                linear = beta @ X.T
                small, whole, risk = logistic(linear)
                value += (happened * linear - counted * (np.maximum(linear, 0.0) + np.log1p(small))).sum(axis=1)
                score += (happened - counted * risk) @ X
            if self.information:
                weight = counted * (small / whole**2)
                products += unpacked(weighted_products(X[None], weight[None])[0], p)
        return (value, score, products) if self.information else (value, score)
