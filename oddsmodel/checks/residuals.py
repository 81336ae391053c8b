"""Residuals of the covariate patterns, exact where fitted probabilities come near 0 or 1."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import xlogy

from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import Leaf

Array = NDArray[np.float64]


@dataclass(frozen=True)
class PatternResiduals:
    """All (m,), one a covariate pattern (or one a record, where records are taken one by one).

    linear: the linear predictor. probability, complement: p and 1 − p, each without loss near 0 or 1.
    raw: events − trials·p. variance: trials·p·(1 − p). pearson: raw / sqrt(variance), infinite where the pattern
    shows what the fit holds impossible. deviance_share: the pattern's share of the deviance.
    """

    linear: Array
    probability: Array
    complement: Array
    raw: Array
    variance: Array
    pearson: Array
    deviance_share: Array

    @property
    def deviance(self) -> Array:
        """Signed square root of the share of the deviance (McCullagh & Nelder 1989, sections 2.4.1 and 2.4.3)."""
        return np.sign(self.raw) * np.sqrt(self.deviance_share)


def pattern_residuals(rows: Leaf, coefficients: Array) -> PatternResiduals:
    """Raw, Pearson and deviance residuals of rows of a pass at coefficients (p,)."""
    events, trials = rows["events"], rows.get("trials")
    others = (1.0 if trials is None else trials) - events
    linear = rows["X"] @ coefficients
    small, whole, probability = logistic(linear)
    complement = np.maximum(small, linear < 0.0) / whole
    raw = events * complement - others * probability
    variance = probability * complement
    if trials is not None:
        variance *= trials
    if variance.all():
        pearson = raw / np.sqrt(variance)
    else:
        edge = np.where(raw == 0.0, 0.0, np.copysign(np.inf, raw))
        pearson = np.divide(raw, np.sqrt(variance), out=edge, where=variance > 0.0)
    normaliser = np.log1p(small)
    half = events * (normaliser - np.minimum(linear, 0.0)) + others * (normaliser + np.maximum(linear, 0.0))
    if trials is not None:
        # A row of the records may stand for no record at all: its residuals are 0.
        divisor = np.where(trials > 0.0, trials, 1.0)
        half += xlogy(events, events / divisor) + xlogy(others, others / divisor)
    share = 2.0 * np.maximum(half, 0.0)
    return PatternResiduals(linear, probability, complement, raw, variance, pearson, share)
