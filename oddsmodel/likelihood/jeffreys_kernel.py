"""Derivatives of tr(M I(beta)) in the coefficients, for the binomial likelihood: what Jeffreys' penalty is made of."""

from __future__ import annotations

import numpy as np

from oddsmodel.likelihood.base import Array, TraceDerivatives
from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import Leaf, Passes

BLOCK_BYTES = 1 << 20
"""Pairwise products are formed for so many bytes of rows at a time, to stay in cache."""

WITHOUT_WEIGHT = 1e-3
"""Rows of x'Mx at most this are left out of the second derivatives: see `_TraceKernel`."""


def trace_derivatives(passes: Passes, beta: Array, roots: Array, second: bool) -> TraceDerivatives:
    """The derivatives of `TraceDerivatives` for binomial rows at beta (k, p) with M = R R', R of roots (k, p, r)."""
    answer = passes.reduce([_TraceKernel(roots, second)], beta)[0]
    if not second:
        return TraceDerivatives(answer[0])
    gradient, hessian, squares, tensor = answer
    return TraceDerivatives(gradient, hessian, np.matmul(tensor, tensor.transpose(0, 2, 1)), squares)


class _TraceKernel:
    """Sums over the rows x of a leaf, with z = R'x, risk mu, information weight w = n mu (1 - mu) and

        w' = w (1 - 2 mu),    w'' = w ((1 - 2 mu)^2 - 2 mu (1 - mu)),

    its derivatives in the linear predictor: the gradient sum w' (z'z) x (k, p); where asked, the Hessian
    sum w'' (z'z) x x', the squares sum w'^2/w (z'z) x x' (k, p, p each) and the tensor sum w' x (z z')
    (k, p, r(r+1)/2), packed by the upper triangle with off-diagonal entries times the root of 2, so that its own inner
    product is that of whole matrices.

    Second derivatives only guide steps. With M the inverse information, the rows of z'z <= q left out of them change
    the Hessian of log|I|, in units of the information, by at most q, and the square of their part of the tensor is at
    most p q: with q = 0.001, as nearly all rows of large data have, steps are those of Newton to a few per cent.
    """

    def __init__(self, roots: Array, second: bool) -> None:
        self.roots, self.second = roots, second
        r = roots.shape[2]
        self.first, self.other = np.triu_indices(r)
        self.twice = np.where(self.first == self.other, 1.0, np.sqrt(2.0))
        self.step = max(64, BLOCK_BYTES // (8 * max(1, self.first.size)))

    def leaf(self, rows: Leaf, beta: Array) -> tuple[Array, ...]:
        X = rows["X"]
        k, p = beta.shape
        with np.errstate(over="ignore", under="ignore", invalid="ignore"):
            linear = X @ beta.T
            if "offset" in rows:
                linear += rows["offset"][:, None]
            small, whole, risk = logistic(linear)
            weight = small / (whole * whole)
            if "trials" in rows:
                weight *= rows["trials"][:, None]
        slope = 1.0 - 2.0 * risk
        gradient = np.zeros((k, p))
        hessian, squares = np.zeros((k, p, p)), np.zeros((k, p, p))
        tensor = np.zeros((k, p, self.first.size))
        for one in np.flatnonzero(self.roots.any(axis=(1, 2))):
            Z = X @ self.roots[one]
            reach = np.einsum("ij,ij->i", Z, Z)
            first = weight[:, one] * slope[:, one]
            gradient[one] = (first * reach) @ X
            if not self.second:
                continue
            heavy = np.flatnonzero((reach > WITHOUT_WEIGHT) & (weight[:, one] > 0.0))
            for start in range(0, heavy.size, self.step):
                some = heavy[start : start + self.step]
                x, z = X[some], Z[some]
                square = slope[some, one] ** 2
                share = weight[some, one] * reach[some]
                squares[one] += x.T @ (x * (share * square)[:, None])
                # 2 mu (1 - mu) is (1 - (1 - 2 mu)^2) / 2
                hessian[one] += x.T @ (x * (share * (1.5 * square - 0.5))[:, None])
                pairs = z[:, self.first] * z[:, self.other] * self.twice
                tensor[one] += (x * first[some, None]).T @ pairs
        return (gradient, hessian, squares, tensor) if self.second else (gradient,)
