"""What the columns add to the log-likelihood, and the measures named after R² that are made of it."""

from __future__ import annotations

import math
from dataclasses import dataclass

from oddsmodel.model.fitted import FittedModel


@dataclass(frozen=True)
class Gain:
    """The log-likelihood of a model and of one that gives every record the overall share of events.

    records: n, how many there are.
    """

    log_likelihood: float
    null: float
    records: float

    @property
    def likelihood_ratio(self) -> float:
        """Twice the difference, 2 (l − l0)."""
        return 2.0 * (self.log_likelihood - self.null)

    @property
    def mcfadden(self) -> float:
        """1 − l / l0 (McFadden 1974, in Zarembka, Frontiers in Econometrics, 105-142)."""
        return 1.0 - self.log_likelihood / self.null

    @property
    def cox_snell(self) -> float:
        """1 − exp(−2 (l − l0) / n) (Cox & Snell 1989, Analysis of Binary Data, 2nd edition, 208-209)."""
        return -math.expm1(-self.likelihood_ratio / self.records)

    @property
    def most(self) -> float:
        """The largest that Cox & Snell's can be at this share of events, 1 − exp(2 l0 / n)."""
        return -math.expm1(2.0 * self.null / self.records)

    @property
    def nagelkerke(self) -> float:
        """Cox & Snell's over the largest that it can be (Nagelkerke 1991, Biometrika 78:691-692)."""
        return self.cox_snell / self.most


def null_log_likelihood(records: float, events: float) -> float:
    """That of every record having the overall share of events, both outcomes being there; binomial constants left out.

    >>> round(null_log_likelihood(189, 59), 3)
    -117.336
    """
    others = records - events
    return events * math.log(events / records) + others * math.log(others / records)


def gain(model: FittedModel) -> Gain:
    """Of a model whose records have both outcomes."""
    return Gain(model.fit.log_likelihood, null_log_likelihood(model.records, model.events), model.records)


def expected_shrinkage(likelihood_ratio: float, parameters: int) -> float | None:
    """By how much predictions for new records are expected to be too far from the middle: (LR − p) / LR.

    The slope of the calibration line that is to be expected with p coefficients beside the intercept (van Houwelingen &
    le Cessie 1990, Statistics in Medicine 9:1303-1325, equation 15, from memory). None unless LR exceeds p.
    """
    return 1.0 - parameters / likelihood_ratio if likelihood_ratio > parameters else None
