"""Residuals of the covariate patterns, exact where fitted probabilities come near 0 or 1."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit, log_expit, xlogy

from oddsmodel.model.fitted import FittedModel

Array = NDArray[np.float64]


@dataclass(frozen=True)
class PatternResiduals:
    """All (m,), one a covariate pattern.

    linear: the linear predictor. probability, complement: p and 1 − p, each without loss near 0 or 1.
    raw: events − trials·p. variance: trials·p·(1 − p). pearson: raw / sqrt(variance), infinite where the pattern
    shows what the fit holds impossible. deviance: signed square root of the pattern's share of the deviance
    (McCullagh & Nelder 1989, sections 2.4.1 and 2.4.3).
    """

    linear: Array
    probability: Array
    complement: Array
    raw: Array
    variance: Array
    pearson: Array
    deviance: Array


def pattern_residuals(model: FittedModel) -> PatternResiduals:
    """Raw, Pearson and deviance residuals of every covariate pattern of a fit."""
    events, trials = model.patterns.events, model.patterns.trials
    others = trials - events
    # A row of the records may stand for no record at all: its residuals are 0.
    divisor = np.where(trials > 0.0, trials, 1.0)
    linear = model.patterns.X @ model.fit.coefficients
    probability, complement = expit(linear), expit(-linear)
    raw = events * complement - others * probability
    variance = trials * probability * complement
    edge = np.where(raw == 0.0, 0.0, np.copysign(np.inf, raw))
    pearson = np.divide(raw, np.sqrt(variance), out=edge, where=variance > 0.0)
    apart = (
        xlogy(events, events / divisor)
        - events * log_expit(linear)
        + xlogy(others, others / divisor)
        - others * log_expit(-linear)
    )
    deviance = np.sign(raw) * np.sqrt(2.0 * np.maximum(apart, 0.0))
    return PatternResiduals(linear, probability, complement, raw, variance, pearson, deviance)
