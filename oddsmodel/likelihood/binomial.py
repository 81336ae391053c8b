"""The binomial likelihood with the logit link, of single records or of covariate patterns."""

from __future__ import annotations

from functools import cached_property
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array, Evaluation
from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import Leaf, MemoryPasses, Passes

PRODUCT_BYTES = 1 << 20
"""Pairwise products of the columns are formed for so many bytes of rows at a time, to stay in cache."""

BATCH, FEW = 4, 2
"""So many leaves are worked on together where coefficient vectors are few; with more, one leaf fills the cache."""

MANY = 4
"""From so many coefficient vectors on, pairwise products of the columns are formed once and shared."""


class BinomialLikelihood:
    """Log-likelihood of beta (p,) for events (n,) out of trials (n,) with logit risk X beta + offset.

        l(beta) = sum_i  y_i eta_i - n_i log(1 + exp(eta_i))
        score   = X'(y - n mu),   information = X' diag(n mu (1 - mu)) X        (McCullagh & Nelder 1989, section 4.4)

    The binomial coefficients are left out, so that collapsing equal rows changes nothing. X is read as it is and
    never copied (a C-ordered float64 array is best). trials and offset of None mean 1 and 0 for every row.

    Raises ValueError where shapes disagree, a number is not finite, or events lie outside 0..trials.
    """

    curvature: Literal["Hessian", "expected"] = "Hessian"
    concave = True

    def __init__(self, X: Any, events: Any, trials: Any = None, offset: Any = None) -> None:
        matrix = np.ascontiguousarray(X, dtype=np.float64)
        if matrix.ndim != 2:
            raise ValueError("X must have two axes, rows and coefficients")
        arrays: dict[str, NDArray[Any]] = {"X": matrix}
        for name, values in (("events", events), ("trials", trials), ("offset", offset)):
            if values is None:
                continue
            vector = np.ascontiguousarray(values, dtype=np.float64)
            if vector.shape != matrix.shape[:1]:
                raise ValueError(f"{name} must have one number for each row of X")
            if not np.isfinite(vector).all():
                raise ValueError(f"{name} must be finite")
            arrays[name] = vector
        with np.errstate(invalid="ignore", over="ignore"):
            suspect = not np.isfinite(matrix.sum())
        if suspect and not np.isfinite(matrix).all():
            raise ValueError("X must be finite")
        limit = arrays.get("trials", np.float64(1.0))
        if (arrays["events"] < 0).any() or (arrays["events"] > limit).any():
            raise ValueError("events must lie between 0 and trials")
        self.passes: Passes = MemoryPasses(arrays)
        self._parameters = int(matrix.shape[1])

    @classmethod
    def over(cls, passes: Passes, parameters: int) -> BinomialLikelihood:
        """The likelihood over rows that a pass already holds, known to be in order."""
        likelihood = cls.__new__(cls)
        likelihood.passes = passes
        likelihood._parameters = parameters
        return likelihood

    @property
    def parameters(self) -> int:
        return self._parameters

    @property
    def rows(self) -> int:
        return self.passes.rows

    def evaluate(self, beta: Array, *, member: NDArray[np.int64] | None = None, information: bool = True) -> Evaluation:
        if member is not None and np.any(member):
            raise ValueError("this likelihood has one data set only, member 0")
        points = np.atleast_2d(np.asarray(beta, dtype=np.float64))
        kernel = _Value(information, batch=BATCH if len(points) <= FEW else 1)
        answer = self.passes.reduce([kernel], points)[0]
        log_likelihood, score = answer[0], answer[1].T
        lost = ~np.isfinite(log_likelihood)
        if lost.any():
            log_likelihood = np.where(lost, -np.inf, log_likelihood)
            score = np.where(lost[:, None], 0.0, score)
        curvature = None
        if information:
            curvature = answer[2]
            if curvature.ndim == 2:
                curvature = _unpack(curvature, self.parameters)
            if lost.any():
                curvature = np.where(lost[:, None, None], 0.0, curvature)
        return Evaluation(log_likelihood, np.ascontiguousarray(score), curvature)

    @cached_property
    def _gram(self) -> Array:
        return self.passes.reduce([_Gram()], None)[0][0]

    def gram(self) -> Array:
        return self._gram

    def transformed(self, basis: Array) -> BinomialLikelihood:
        if not isinstance(self.passes, MemoryPasses):
            raise TypeError("rows that are not in memory cannot be transformed")
        X = self.passes.arrays["X"]
        exact = np.asarray(basis, dtype=np.longdouble)
        moved = np.empty((X.shape[0], basis.shape[1]))
        for start in range(0, X.shape[0], 4096):
            moved[start : start + 4096] = X[start : start + 4096].astype(np.longdouble) @ exact
        return BinomialLikelihood.over(MemoryPasses({**self.passes.arrays, "X": moved}), basis.shape[1])

    def thinned(self, leaves: int) -> BinomialLikelihood:
        return BinomialLikelihood.over(self.passes.thinned(leaves), self._parameters)

    def triangle(self) -> Array:
        if not isinstance(self.passes, MemoryPasses):
            raise TypeError("rows that are not in memory cannot be factorised")
        X, trials = self.passes.arrays["X"], self.passes.arrays.get("trials")
        if trials is not None and not (trials > 0.0).all():
            # a row of no trials bears on nothing: a column that only such rows fill is aliased
            X = X[trials > 0.0]
        size = max(4096, 4 * X.shape[1])
        triangle = np.zeros((0, X.shape[1]))
        for start in range(0, X.shape[0], size):
            triangle = np.asarray(np.linalg.qr(np.vstack([triangle, X[start : start + size]]), mode="r"))
        return triangle

    def rows_apart(self) -> tuple[Array, Array, Array]:
        if not isinstance(self.passes, MemoryPasses):
            raise TypeError("separation is decided on rows in memory")
        arrays = self.passes.arrays
        return arrays["X"], arrays["events"], arrays.get("trials", np.ones(self.rows))

    def extended_score(self, beta: NDArray[np.longdouble]) -> NDArray[np.longdouble]:
        return self.passes.reduce([_ExtendedScore()], beta)[0][0]


class _Value:
    """Log-likelihood, score and, where asked, information at many coefficient vectors."""

    def __init__(self, information: bool, batch: int) -> None:
        self.information, self.batch = information, batch

    def leaf(self, rows: Leaf, beta: Array) -> tuple[Array, ...]:
        return tuple(answer[0] for answer in self.leaves(rows, 1, beta))

    def leaves(self, rows: Leaf, number: int, beta: Array) -> tuple[Array, ...]:
        X, events = rows["X"], rows["events"]
        trials, offset = rows.get("trials"), rows.get("offset")
        apart = X.reshape(number, -1, X.shape[1])
        with np.errstate(over="ignore", invalid="ignore", under="ignore"):
            linear = X @ beta.T
            if offset is not None:
                linear += offset[:, None]
            small, whole, risk = logistic(linear)
            normaliser = np.log1p(small)
            normaliser += np.maximum(linear, 0.0)
            if trials is not None:
                normaliser *= trials[:, None]
                residual = events[:, None] - trials[:, None] * risk
            else:
                residual = events[:, None] - risk
            linear *= events[:, None]
            linear -= normaliser
            log_likelihood = linear.reshape(number, -1, len(beta)).sum(axis=1)
            score = np.matmul(apart.transpose(0, 2, 1), residual.reshape(number, -1, len(beta)))
            if not self.information:
                return log_likelihood, score
            weight = small / (whole * whole)
            if trials is not None:
                weight *= trials[:, None]
            return log_likelihood, score, _weighted_products(apart, weight.reshape(number, -1, len(beta)))


def _weighted_products(X: Array, weight: Array) -> Array:
    """X' diag(w) X in each of b leaves, X (b, n, p), for each column w of weight (b, n, k).

    (b, k, p, p), or packed (b, p(p+1)/2, k) where k is large.
    """
    leaves, rows, p = X.shape
    k = weight.shape[2]
    if k < MANY:
        products = np.empty((leaves, k, p, p))
        for one in range(k):
            products[:, one] = np.matmul((X * weight[:, :, one : one + 1]).transpose(0, 2, 1), X)
        return products
    first, second = np.triu_indices(p)
    packed = np.zeros((leaves, first.size, k))
    step = max(64, PRODUCT_BYTES // (8 * first.size))
    for leaf in range(leaves):
        for start in range(0, rows, step):
            block = X[leaf, start : start + step]
            packed[leaf] += (block[:, first] * block[:, second]).T @ weight[leaf, start : start + step]
    return packed


def _unpack(packed: Array, p: int) -> Array:
    first, second = np.triu_indices(p)
    full = np.empty((packed.shape[1], p, p))
    full[:, first, second] = packed.T
    full[:, second, first] = packed.T
    return full


class _Gram:
    batch = BATCH

    def leaf(self, rows: Leaf, state: None) -> tuple[Array]:
        X, trials = rows["X"], rows.get("trials")
        return (X.T @ X if trials is None else X.T @ (X * trials[:, None]),)

    def leaves(self, rows: Leaf, number: int, state: None) -> tuple[Array]:
        weighted = rows["X"] if "trials" not in rows else rows["X"] * rows["trials"][:, None]
        X, weighted = (array.reshape(number, -1, array.shape[1]) for array in (rows["X"], weighted))
        return (np.matmul(X.transpose(0, 2, 1), weighted),)


class _ExtendedScore:
    """The score in extended precision at one coefficient vector held in extended precision."""

    def leaf(self, rows: Leaf, beta: NDArray[np.longdouble]) -> tuple[NDArray[np.longdouble]]:
        X = rows["X"].astype(np.longdouble)
        linear = X @ beta
        if "offset" in rows:
            linear += rows["offset"]
        _, _, risk = logistic(linear)
        expected = risk if "trials" not in rows else rows["trials"] * risk
        return ((rows["events"] - expected) @ X,)
