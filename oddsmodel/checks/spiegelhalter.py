"""Spiegelhalter's test of calibration, allowing for the coefficients being fitted to the same records."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import erfc

from oddsmodel.inference.maximise import Fit
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import Leaf

Array = NDArray[np.float64]

NOTHING_LEFT = 1e-9
"""Share of the weights' variation outside the span of the columns below which there is nothing to test."""


@dataclass(frozen=True)
class Spiegelhalter:
    """z: standard normal where the model holds; p: two-sided. skewness, kurtosis: of the statistic under the model.

    All None where the columns leave nothing to test.
    """

    z: float | None
    p: float | None
    skewness: float | None
    kurtosis: float | None


NONE = Spiegelhalter(None, None, None, None)


def spiegelhalter(fit: Fit) -> Spiegelhalter:
    """Whether the squared distances of outcomes from their probabilities are as large as these say.

    Spiegelhalter 1986, Statistics in Medicine 5:421-433, equation 6 (from memory), tests
    sum (y − p)(1 − 2p) = sum ((y − p)² − p(1 − p)) by its variance sum p(1 − p)(1 − 2p)² for probabilities from
    elsewhere. On the records fitted, the residuals obey sum (y − p) x = 0 for each column x, and only what of 1 − 2p
    the columns do not explain is left to vary: with v = p(1 − p), b = sum v (1 − 2p) x, I = sum v x x' and

        r = (1 − 2p) − x'I⁻¹b,    z = (sum (y − p) r − m) / sqrt(sum v r²).

    Its mean m is not 0, as p is taken where it suits the records: to the second order (with the bias of the
    coefficients, Cordeiro & McCullagh 1991, Journal of the Royal Statistical Society B 53:629-643) it is

        m = −1/2 sum h (1 − 2p) r,    h = v x'I⁻¹x the leverages.
    """
    working = fit.space.working
    assert isinstance(working, BinomialLikelihood)
    inverse = solve(fit.working_information, np.eye(fit.working.size))
    weighted, whole = working.passes.reduce([_Explained()], fit.working)[0]
    slopes = inverse @ weighted
    sums = working.passes.reduce([_Left()], (fit.working, slopes, inverse))[0][0]
    statistic, variance, third, fourth, mean = sums.tolist()
    if not variance > NOTHING_LEFT * float(whole):
        return NONE
    z = (statistic - mean) / math.sqrt(variance)
    p = float(erfc(abs(z) / math.sqrt(2.0)))
    return Spiegelhalter(z, p, third / variance**1.5, fourth / variance**2)


class _Explained:
    """sum v (1 − 2p) x (p,) and sum v (1 − 2p)² at coefficients (p,)."""

    def leaf(self, rows: Leaf, coefficients: Array) -> tuple[Array, Array]:
        _, v, d = _parts(rows, coefficients)
        return (v * d) @ rows["X"], np.asarray(v @ d**2)


class _Left:
    """sum (y − p) r, v r², v (1 − 2p) r³, v (1 − 6 p (1 − p)) r⁴ and −h (1 − 2p) r / 2 (5,)."""

    def leaf(self, rows: Leaf, state: tuple[Array, Array, Array]) -> tuple[Array]:
        coefficients, slopes, inverse = state
        residual, v, d = _parts(rows, coefficients)
        X = rows["X"]
        r = d - X @ slopes
        leverage = v * np.einsum("ij,ij->i", X @ inverse, X)
        # 1 − 6p(1 − p) = (3 (1 − 2p)² − 1) / 2
        sums = (residual @ r, v @ r**2, v @ (d * r**3), v @ ((3.0 * d**2 - 1.0) / 2.0 * r**4), -0.5 * leverage @ (d * r))
        return (np.array(sums),)


def _parts(rows: Leaf, coefficients: Array) -> tuple[Array, Array, Array]:
    """Residuals, p(1 − p) times the records of a row, and 1 − 2p."""
    small, whole, risk = logistic(rows["X"] @ coefficients)
    trials = rows.get("trials", 1.0)
    return rows["events"] - trials * risk, trials * (small / whole**2), 1.0 - 2.0 * risk
