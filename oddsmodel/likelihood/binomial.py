"""The binomial likelihood with the logit link, of single records or of covariate patterns."""

from __future__ import annotations

from functools import cached_property
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array, Evaluation, TraceDerivatives
from oddsmodel.likelihood.jeffreys_kernel import trace_derivatives
from oddsmodel.likelihood.kernels import ExtendedScoreKernel, GramKernel, ValueKernel, unpacked
from oddsmodel.passes import LEAF_ROWS, Leaf, MemoryPasses, Passes


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
        answer = self.passes.reduce([ValueKernel(information, len(points))], points)[0]
        log_likelihood, score = answer[0], answer[1]
        lost = ~np.isfinite(log_likelihood)
        if lost.any():
            log_likelihood = np.where(lost, -np.inf, log_likelihood)
            score = np.where(lost[:, None], 0.0, score)
        curvature = None
        if information:
            curvature = unpacked(answer[2], self.parameters)
            if lost.any():
                curvature = np.where(lost[:, None, None], 0.0, curvature)
        return Evaluation(log_likelihood, score, curvature)

    @cached_property
    def _gram(self) -> Array:
        return self.passes.reduce([GramKernel()], None)[0][0]

    def gram(self) -> Array:
        return self._gram

    def transformed(self, basis: Array) -> BinomialLikelihood:
        moved = Moved(np.asarray(basis, dtype=np.longdouble))
        if isinstance(self.passes, MemoryPasses):
            X = np.empty((self.rows, basis.shape[1]))
            for start in range(0, self.rows, LEAF_ROWS):
                X[start : start + LEAF_ROWS] = moved.of(self.passes.arrays["X"][start : start + LEAF_ROWS])
            return BinomialLikelihood.over(MemoryPasses({**self.passes.arrays, "X": X}), basis.shape[1])
        return BinomialLikelihood.over(self.passes.mapped(moved).kept(), basis.shape[1])

    def thinned(self, leaves: int) -> BinomialLikelihood:
        return BinomialLikelihood.over(self.passes.thinned(leaves), self._parameters)

    def triangle(self) -> Array:
        triangle = np.zeros((0, self.parameters))
        for part in self.passes.each(triangle_of_rows):
            triangle = np.asarray(np.linalg.qr(np.vstack([triangle, part]), mode="r"))
        return triangle

    def rows_apart(self) -> tuple[Array, Array, Array]:
        if not isinstance(self.passes, MemoryPasses):
            raise TypeError("these rows are not in memory")
        arrays = self.passes.arrays
        return arrays["X"], arrays["events"], arrays.get("trials", np.ones(self.rows))

    def extended_score(self, beta: NDArray[np.longdouble]) -> NDArray[np.longdouble]:
        return self.passes.reduce([ExtendedScoreKernel()], beta)[0][0]

    def trace_derivatives(
        self, beta: Array, roots: Array, *, member: NDArray[np.int64] | None = None, second: bool = False
    ) -> TraceDerivatives:
        if member is not None and np.any(member):
            raise ValueError("this likelihood has one data set only, member 0")
        return trace_derivatives(self.passes, beta, roots, second)


class Moved:
    """Rows whose matrix is multiplied by a basis (p, r) that is taken as exact."""

    def __init__(self, basis: NDArray[np.longdouble]) -> None:
        self.basis = basis

    def of(self, X: Array) -> Array:
        """X basis (n, r), rounded once."""
        return np.asarray(X.astype(np.longdouble) @ self.basis, dtype=np.float64)

    def __call__(self, rows: Leaf) -> Leaf:
        return {**rows, "X": self.of(rows["X"])}


def triangle_of_rows(rows: Leaf, first: int, state: None) -> Array:
    """R of a QR factorisation of the rows' matrix. A row of no trials bears on nothing: a column that only such rows
    fill is aliased."""
    X, trials = rows["X"], rows.get("trials")
    if trials is not None and not (trials > 0.0).all():
        X = X[trials > 0.0]
    return np.asarray(np.linalg.qr(X, mode="r"))
