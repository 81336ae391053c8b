"""Sums over the rows of a leaf: log-likelihood, score and information at many coefficient vectors."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array
from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import Leaf

BATCH, FEW = 4, 2
"""So many leaves are worked on together where coefficient vectors are few; with more, one leaf fills the cache."""

BLOCK_BYTES = 1 << 20
"""With many coefficient vectors a leaf is worked on in blocks of rows whose values take so many bytes.

Blocks that fit a smaller cache would be a little faster on one core, but threads wait for one another at every call.
"""

ROOTED_BYTES = 1 << 22
"""Columns weighed by the roots of weights are held for so many bytes of vectors at a time, at least for one."""

PRODUCT_BYTES, PRODUCT_ROWS = 1 << 21, 256
"""Products of pairs of columns are formed for so many bytes at a time, but for no fewer rows than are worth a call."""

MANY = 8
"""From so many coefficient vectors on, and a third as many as the columns, pairs of columns are multiplied once and
shared by all; fewer vectors weigh the columns by the roots of their weights, one vector after the other."""

STEEPEST = 700.0
"""exp() of little more than this overflows."""


class ValueKernel:
    """Log-likelihood, score and, where asked, information of binomial rows at coefficient vectors beta (k, p).

    Every row is seen from the side of its rarer outcome. With eta = x'beta, y events in n trials, m = min(y, n - y),
    t = 1 where y > n/2 and -1 elsewhere, and v = -t eta, the log odds of the rarer outcome, the row adds

        m v - n log(1 + exp(v)),

    to the log-likelihood, in which nothing cancels. Its derivative in eta is t (n s - m) and its weight
    n s / (1 + exp(v)), where s = exp(v) / (1 + exp(v)). So a row and a vector cost one exp, one log1p and one division.

    The answers: log-likelihoods (k,), scores (k, p) and, where asked, informations (k, p, p), or packed by the
    upper triangle (k, p(p+1)/2) where vectors are many.
    """

    def __init__(self, information: bool, vectors: int) -> None:
        self.information = information
        self.batch = BATCH if vectors <= FEW else 1

    def leaf(self, rows: Leaf, beta: Array) -> tuple[Array, ...]:
        length, k = rows["X"].shape[0], len(beta)
        step = max(1, min(length, max(64, BLOCK_BYTES // (8 * k))))
        space = np.empty((2, 1, k, step))
        weight = np.empty((1, k, length)) if self.information else np.empty((1, k, step))
        log_likelihood, score = np.zeros(k), np.zeros(beta.shape)
        for start in range(0, length, step):
            block = {name: array[start : start + step] for name, array in rows.items()}
            left = length - start
            part = weight[..., start : start + step] if self.information else weight[..., :left]
            value, slope = self._values(block, 1, beta, space[0, ..., :left], space[1, ..., :left], part)
            log_likelihood += value[0]
            score += slope[0]
        if not self.information:
            return log_likelihood, score
        return log_likelihood, score, weighted_products(rows["X"][None], weight)[0]

    def leaves(self, rows: Leaf, number: int, beta: Array) -> tuple[Array, ...]:
        """The answers for `number` leaves of equal length, each with a first axis over the leaves."""
        X = rows["X"].reshape(number, -1, rows["X"].shape[1])
        log_odds, odds, weight = np.empty((3, number, len(beta), X.shape[1]))
        log_likelihood, score = self._values(rows, number, beta, log_odds, odds, weight)
        if not self.information:
            return log_likelihood, score
        return log_likelihood, score, weighted_products(X, weight)

    def _values(
        self, rows: Leaf, number: int, beta: Array, log_odds: Array, odds: Array, part: Array
    ) -> tuple[Array, Array]:
        """Log-likelihoods (b, k) and scores (b, k, p) of b leaves; the weights, where asked, are left in `part`.

        log_odds, odds and part (b, k, rows of a leaf) are worked in.
        """
        X = rows["X"].reshape(number, -1, rows["X"].shape[1])
        events, trials, offset = (_across(rows, name, number) for name in ("events", "trials", "offset"))
        assert events is not None
        rarer, towards = _rarer_side(events, trials)
        with np.errstate(over="ignore", invalid="ignore", under="ignore"):
            np.matmul(-beta, X.transpose(0, 2, 1), out=log_odds)
            if offset is not None:
                log_odds -= offset
            log_odds *= towards
            np.exp(log_odds, out=odds)
            log_likelihood = _log_likelihood(log_odds, odds, rarer, trials, part)
            if not np.isfinite(log_likelihood).all():
                beyond = np.maximum(log_odds - STEEPEST, 0.0)
                beyond *= (1.0 if trials is None else trials) - (0.0 if rarer is None else rarer)
                np.exp(np.minimum(log_odds, STEEPEST, out=log_odds), out=odds)
                log_likelihood = _log_likelihood(log_odds, odds, rarer, trials, part) - beyond.sum(axis=2)
            inverse = np.divide(1.0, np.add(odds, 1.0, out=log_odds), out=log_odds)
            risk = np.multiply(odds, inverse, out=odds)
            if trials is not None:
                risk *= trials
            if self.information:
                np.multiply(risk, inverse, out=part)
            if rarer is not None:
                risk -= rarer
            risk *= towards
            return log_likelihood, np.matmul(risk, X)


def _across(rows: Leaf, name: str, number: int) -> Array | None:
    return rows[name].reshape(number, 1, -1) if name in rows else None


def _rarer_side(events: Array, trials: Array | None) -> tuple[Array | None, Array]:
    """m = min(y, n - y), None where it is 0 in all rows, and t: 1 where y > n/2, -1 elsewhere."""
    towards = np.multiply(2.0 * events > (1.0 if trials is None else trials), 2.0)
    towards -= 1.0
    rarer = np.minimum(events, (1.0 if trials is None else trials) - events)
    return rarer if rarer.any() else None, towards


def _log_likelihood(log_odds: Array, odds: Array, rarer: Array | None, trials: Array | None, part: Array) -> Array:
    """sum of m v - n log(1 + exp(v)) over the last axis, from v and exp(v), worked out in `part`."""
    np.log1p(odds, out=part)
    if trials is not None:
        part *= trials
    if rarer is not None:
        part -= rarer * log_odds
    return np.asarray(-part.sum(axis=2))


def weighted_products(X: Array, weight: Array) -> Array:
    """X' diag(w) X in each of b leaves, X (b, n, p), for each row w of weight (b, k, n), which is used up.

    (b, k, p, p), or packed by the upper triangle (b, k, p(p+1)/2) where k is large.
    """
    leaves, rows, p = X.shape
    k = weight.shape[1]
    if k < MANY or 3 * k < p:
        np.sqrt(weight, out=weight)
        products = np.empty((leaves, k, p, p))
        step = max(1, min(k, ROOTED_BYTES // max(1, X.nbytes)))
        rooted = np.empty((leaves, step, rows, p))
        for start in range(0, k, step):
            some = rooted[:, : k - start]
            np.multiply(X[:, None], weight[:, start : start + step, :, None], out=some)
            # a matrix times its own transpose: half the work of a general product
            np.matmul(some.transpose(0, 1, 3, 2), some, out=products[:, start : start + step])
        return products
    couples = p * (p + 1) // 2
    step = max(1, min(rows, max(PRODUCT_ROWS, PRODUCT_BYTES // (8 * couples))))
    packed = np.zeros((leaves, k, couples))
    pairs = np.empty((couples, step))
    for leaf in range(leaves):
        for start in range(0, rows, step):
            products = _pairs(X[leaf, start : start + step], pairs[:, : rows - start])
            packed[leaf] += weight[leaf, :, start : start + step] @ products.T
    return packed


def _pairs(X: Array, pairs: Array) -> Array:
    """Products of all pairs of columns of X (n, p), by the upper triangle, into pairs (p(p+1)/2, n)."""
    columns = np.ascontiguousarray(X.T)
    at = 0
    for one in range(len(columns)):
        np.multiply(columns[one:], columns[one], out=pairs[at : at + len(columns) - one])
        at += len(columns) - one
    return pairs


def unpacked(information: Array, p: int) -> Array:
    """Informations (k, p, p) of `ValueKernel`'s answer, packed or not."""
    if information.ndim == 3:
        return information
    first, second = np.triu_indices(p)
    full = np.empty((information.shape[0], p, p))
    full[:, first, second] = information
    full[:, second, first] = information
    return full


class GramKernel:
    """X'NX with the trials N on its diagonal (p, p)."""

    batch = BATCH

    def leaf(self, rows: Leaf, state: None) -> tuple[Array]:
        return (self.leaves(rows, 1, state)[0][0],)

    def leaves(self, rows: Leaf, number: int, state: None) -> tuple[Array]:
        """The gram matrices of `number` leaves of equal length (number, p, p)."""
        X = rows["X"] if "trials" not in rows else rows["X"] * np.sqrt(rows["trials"])[:, None]
        X = X.reshape(number, -1, X.shape[1])
        return (np.matmul(X.transpose(0, 2, 1), X),)


class ExtendedScoreKernel:
    """The score (p,) in extended precision at one coefficient vector held in extended precision."""

    def leaf(self, rows: Leaf, beta: NDArray[np.longdouble]) -> tuple[NDArray[np.longdouble]]:
        X = rows["X"].astype(np.longdouble)
        linear = X @ beta
        if "offset" in rows:
            linear += rows["offset"]
        _, _, risk = logistic(linear)
        expected = risk if "trials" not in rows else rows["trials"] * risk
        return ((rows["events"] - expected) @ X,)
