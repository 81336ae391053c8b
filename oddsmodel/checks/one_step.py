"""What leaving out one covariate pattern does to the fit, to one step of Newton's method."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.residuals import PatternResiduals
from oddsmodel.model.fitted import FittedModel

Array = NDArray[np.float64]

ALONE = 1e-8
"""1 − leverage below which a pattern fixes a coefficient by itself."""

ROUNDED = 30
"""Binary digits of a score that count when patterns are put in order."""

NO_SCORE = 1e-16
"""A squared standardised shift below this is rounding, whatever the number of records."""


@dataclass(frozen=True)
class AtTheFit:
    """What one-step diagnostics need of a fit besides the rows.

    inverse (r, r): of the information in working coordinates; to_beta (p, r): from them, None where they are the
    coefficients. chosen: the q coefficients asked for; scale (q,) their standard errors; weights (q, q): the inverse
    of their correlations.
    """

    coefficients: Array
    inverse: Array
    to_beta: Array | None
    chosen: tuple[int, ...]
    scale: Array
    weights: Array

    @classmethod
    def of(cls, model: FittedModel, targets: Sequence[int]) -> AtTheFit:
        """Those of a model's fit, with the coefficients of interest."""
        chosen = list(targets)
        covariance = model.fit.covariance[np.ix_(chosen, chosen)]
        scale = np.sqrt(np.diag(covariance))
        return cls(
            coefficients=model.fit.coefficients,
            inverse=np.asarray(np.linalg.inv(model.fit.working_information), dtype=np.float64),
            to_beta=model.fit.space.to_beta,
            chosen=tuple(chosen),
            scale=scale,
            weights=np.asarray(np.linalg.inv(covariance / np.outer(scale, scale)), dtype=np.float64),
        )


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

    def at(self, positions: NDArray[np.int64]) -> OneStep:
        """Those of some of the patterns."""
        return OneStep(*(getattr(self, field.name)[positions] for field in fields(self)))

    @property
    def score(self) -> Array:
        """What patterns are put in order by: the shift of the coefficients asked for, infinite where essential."""
        return np.where(self.essential, np.inf, self.target_distance)


def one_step(X: Array, residuals: PatternResiduals, fit: AtTheFit) -> OneStep:
    """One-step diagnostics of patterns X (m, p) (Pregibon 1981, Annals of Statistics 9:705-724, sections 4 and 5).

    With r and d the pattern's Pearson and deviance residuals, h its leverage and V the covariance:

        delta chi-square = r² / (1 − h),   delta deviance = d² + r² h / (1 − h),   distance = r² h / (1 − h)²,
        change of the coefficients = −V x (events − trials·p) / (1 − h).

    Computed in the fit's working coordinates, where nearly collinear columns do no harm.
    """
    if fit.to_beta is not None:
        X = X @ fit.to_beta
    moved = X @ fit.inverse
    chosen = list(fit.chosen)
    toward = moved[:, chosen] if fit.to_beta is None else moved @ fit.to_beta[chosen].T
    reach = np.einsum("ij,ij->i", moved, X)
    leverage = np.clip(residuals.variance * reach, 0.0, 1.0)

    remaining = 1.0 - leverage
    raw, share = residuals.raw, residuals.deviance_share
    with np.errstate(over="ignore"):
        squared = residuals.pearson**2
    alone = remaining < ALONE
    essential = np.zeros_like(alone)
    if alone.any():
        remaining, raw, share = np.where(alone, 1.0, remaining), np.where(alone, 0.0, raw), np.where(alone, 0.0, share)
        related = np.abs(toward / fit.scale).max(axis=1, initial=0.0) > 1e-6 * np.sqrt(np.maximum(reach, 0.0))
        essential = alone & related
    hidden = alone | ~np.isfinite(squared)
    if hidden.any():
        squared = np.where(hidden, 0.0, squared)
    change = -toward * (raw / remaining)[:, None]
    standardised = change / fit.scale
    delta_chi_square = squared / remaining
    lost = delta_chi_square * leverage
    return OneStep(
        probability=residuals.probability,
        leverage=leverage,
        delta_chi_square=delta_chi_square,
        delta_deviance=share + lost,
        distance=lost / remaining,
        change=change,
        target_distance=np.maximum(np.einsum("ij,ij->i", standardised @ fit.weights, standardised), 0.0),
        alone=alone,
        essential=essential,
    )


def joined(parts: Sequence[OneStep]) -> OneStep:
    """Diagnostics of patterns one after another."""
    return OneStep(*(np.concatenate([getattr(part, field.name) for part in parts]) for field in fields(OneStep)))


def ranked(score: Array, most: int) -> NDArray[np.int64]:
    """Positions of the largest scores (m,), largest first; scores equal to within rounding keep their order.

    The order of two does not depend on what others there are, so the largest of several parts are found part by part.
    """
    count = min(most, score.size)
    if count <= 0:
        return np.zeros(0, dtype=np.int64)
    edge = float(np.partition(score, score.size - count)[score.size - count])
    candidates = np.flatnonzero(score >= edge * (1.0 - 2.0 ** (2 - ROUNDED)) if edge > NO_SCORE else score >= 0.0)
    mantissa, exponent = np.frexp(score[candidates])
    rounded = np.ldexp(np.round(np.ldexp(mantissa, ROUNDED)), exponent - ROUNDED)
    level = np.where(score[candidates] > NO_SCORE, rounded, 0.0)
    return np.asarray(candidates[np.lexsort((candidates, -level))][:count], dtype=np.int64)
