"""What leaving out one covariate pattern does to the fit, to one step of Newton's method."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.residuals import pattern_residuals
from oddsmodel.model.fitted import FittedModel

Array = NDArray[np.float64]

ALONE = 1e-8
"""1 − leverage below which a pattern fixes a coefficient by itself."""


@dataclass(frozen=True)
class OneStep:
    """Diagnostics of m covariate patterns and the q coefficients asked for.

    probability (m,): fitted. leverage (m,): h, from 0 to 1. delta_chi_square, delta_deviance (m,): fall of either
    statistic without the pattern. distance (m,): standardised shift of all coefficients without it.
    change (m, q): shift of each coefficient asked for when the pattern's records are left out.
    target_distance (m,): the shift of those q, standardised by their covariance.
    alone (m,): patterns that fix a coefficient by themselves; their other entries are 0.
    essential (m,): those of them without which a coefficient asked for has no estimate.
    """

    probability: Array
    leverage: Array
    delta_chi_square: Array
    delta_deviance: Array
    distance: Array
    change: Array
    target_distance: Array
    alone: NDArray[np.bool_]
    essential: NDArray[np.bool_]


def one_step(model: FittedModel, targets: tuple[int, ...]) -> OneStep:
    """One-step diagnostics by covariate pattern (Pregibon 1981, Annals of Statistics 9:705-724, sections 4 and 5).

    With r and d the pattern's Pearson and deviance residuals, h its leverage and V the covariance:

        delta chi-square = r² / (1 − h),   delta deviance = d² + r² h / (1 − h),   distance = r² h / (1 − h)²,
        change of the coefficients = −V x (events − trials·p) / (1 − h).

    Computed in the fit's working coordinates, where nearly collinear columns do no harm.
    """
    residuals = pattern_residuals(model)
    to_beta, inverse = model.fit.space.to_beta, np.linalg.inv(model.fit.working_information)
    X = model.patterns.X if to_beta is None else model.patterns.X @ to_beta
    moved = X @ inverse
    reach = np.einsum("ij,ij->i", moved, X)
    leverage = np.clip(residuals.variance * reach, 0.0, 1.0)
    chosen = list(targets)
    toward = moved[:, chosen] if to_beta is None else moved @ to_beta[chosen].T

    remaining = 1.0 - leverage
    alone = remaining < ALONE
    divisor = np.where(alone, 1.0, remaining)
    pearson = np.where(alone | ~np.isfinite(residuals.pearson), 0.0, residuals.pearson)
    squared = pearson**2
    change = -toward * (np.where(alone, 0.0, residuals.raw) / divisor)[:, None]

    covariance = model.fit.covariance[np.ix_(chosen, chosen)]
    scale = np.sqrt(np.diag(covariance))
    standardised = change / scale
    weights = np.linalg.inv(covariance / np.outer(scale, scale))
    related = np.abs(toward / scale).max(axis=1, initial=0.0) > 1e-6 * np.sqrt(np.maximum(reach, 0.0))
    return OneStep(
        probability=residuals.probability,
        leverage=leverage,
        delta_chi_square=squared / divisor,
        delta_deviance=np.where(alone, 0.0, residuals.deviance**2) + squared * leverage / divisor,
        distance=squared * leverage / divisor**2,
        change=change,
        target_distance=np.maximum(np.einsum("ij,jk,ik->i", standardised, weights, standardised), 0.0),
        alone=alone,
        essential=alone & related,
    )


def ranked(score: Array, most: int) -> NDArray[np.int64]:
    """Positions of the largest scores, largest first; scores equal to within rounding keep their order."""
    highest = float(score.max(initial=0.0))
    level = np.round(score / highest, 9) if highest > 0.0 else score
    count = min(most, score.size)
    edge = np.partition(level, score.size - count)[score.size - count]
    candidates = np.flatnonzero(level >= edge)
    order = np.lexsort((candidates, -level[candidates]))
    return np.asarray(candidates[order][:count], dtype=np.int64)
