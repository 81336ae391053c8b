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
"""Share of the variation of 1 − 2p outside the span of the columns below which there is nothing to test."""

LOPSIDED, PEAKED = 0.5, 1.0
"""Skewness and excess kurtosis, either way, up to which the statistic counts as near normal."""


@dataclass(frozen=True)
class Spiegelhalter:
    """z: standard normal where the model holds; p: two-sided. skewness, kurtosis: of the statistic under the model."""

    z: float
    p: float
    skewness: float
    kurtosis: float

    @property
    def near_normal(self) -> bool:
        return abs(self.skewness) <= LOPSIDED and abs(self.kurtosis) <= PEAKED


def spiegelhalter(fit: Fit) -> Spiegelhalter | None:
    """Whether the squared distances of outcomes from their probabilities are as large as these say.

    Spiegelhalter 1986, Statistics in Medicine 5:421-433 (equation 6, from memory), tests
    sum (y − p)(1 − 2p) = sum ((y − p)² − p(1 − p)) by its variance sum p(1 − p)(1 − 2p)², for probabilities from
    elsewhere. On the records fitted the residuals obey sum (y − p) x = 0 for each column x, so that only what of 1 − 2p
    the columns do not explain is left to vary: to the first order, with v = p(1 − p), I = sum v x x' and

        r = (1 − 2p) − x'I⁻¹ sum v (1 − 2p) x,    z = sum (y − p) r / sqrt(sum v r²).

    The third and fourth cumulants of an outcome, v (1 − 2p) and v (1 − 6v), give skewness and kurtosis of the sum.
    For single records this is the unweighted sum of squares on a scale of its own (Copas 1989, Applied Statistics
    38:71-80). None where the columns explain all of 1 − 2p.
    """
    working = fit.space.working
    assert isinstance(working, BinomialLikelihood)
    weighted, whole = working.passes.reduce([_Explained()], fit.working)[0]
    slopes = solve(fit.working_information, weighted)
    sums = working.passes.reduce([_Left()], (fit.working, slopes))[0][0]
    statistic, variance, third, fourth = sums.tolist()
    if not variance > NOTHING_LEFT * float(whole):
        return None
    z = statistic / math.sqrt(variance)
    return Spiegelhalter(z, float(erfc(abs(z) / math.sqrt(2.0))), third / variance**1.5, fourth / variance**2)


class _Explained:
    """sum v (1 − 2p) x (p,) and sum v (1 − 2p)² at coefficients (p,)."""

    def leaf(self, rows: Leaf, coefficients: Array) -> tuple[Array, Array]:
        _, v, d = _parts(rows, coefficients)
        return (v * d) @ rows["X"], np.asarray(v @ d**2)


class _Left:
    """sum (y − p) r, v r², v (1 − 2p) r³ and v (1 − 6 p (1 − p)) r⁴ (4,), at coefficients and slopes (p,)."""

    def leaf(self, rows: Leaf, state: tuple[Array, Array]) -> tuple[Array]:
        coefficients, slopes = state
        residual, v, d = _parts(rows, coefficients)
        r = d - rows["X"] @ slopes
        # 1 − 6p(1 − p) = (3 (1 − 2p)² − 1) / 2
        sums = (residual @ r, v @ r**2, v @ (d * r**3), v @ ((3.0 * d**2 - 1.0) / 2.0 * r**4))
        return (np.array(sums),)


def _parts(rows: Leaf, coefficients: Array) -> tuple[Array, Array, Array]:
    """Residuals, p(1 − p) times the records of a row, and 1 − 2p."""
    small, whole, risk = logistic(rows["X"] @ coefficients)
    trials = rows.get("trials", 1.0)
    return rows["events"] - trials * risk, trials * (small / whole**2), 1.0 - 2.0 * risk
