"""The Brier score taken apart by groups of the fitted probability, to the last digit."""

from __future__ import annotations

from typing import NamedTuple

from oddsmodel.checks.probability_groups import OrderedRecords


class BrierParts(NamedTuple):
    """score = reliability − resolution + uncertainty + within_variance − within_covariance."""

    score: float
    reliability: float
    resolution: float
    uncertainty: float
    within_variance: float
    within_covariance: float


def brier_parts(groups: OrderedRecords, total: float) -> BrierParts:
    """The parts of the Brier score with records in groups; total: the sum of (y − p)² over all of them.

    Murphy 1973 (Journal of Applied Meteorology 12:595-600) takes it apart for records with equal probabilities in each
    group. Where they are not equal, two parts within the groups make the sum exact (Stephenson, Coelho & Jolliffe
    2008, Weather and Forecasting 23:752-757). With n_k records in group k, the mean probability p_k and the share of
    events y_k there, and the share y of all n:

        reliability       sum n_k (p_k − y_k)² / n
        resolution        sum n_k (y_k − y)² / n
        uncertainty       y (1 − y)
        within_variance   sum over records (p − p_k)² / n
        within_covariance 2 sum over records (p − p_k)(outcome − y_k) / n
    """
    n, events = float(groups.records.sum()), float(groups.events.sum())
    p, y, share = groups.probability, groups.events / groups.records, events / n
    squares = float((groups.expected - groups.variance).sum())
    # (y − p)² = y − 2yp + p² for an outcome y of 0 or 1
    products = (events + squares - total) / 2.0
    return BrierParts(
        score=total / n,
        reliability=float(groups.records @ (p - y) ** 2) / n,
        resolution=float(groups.records @ (y - share) ** 2) / n,
        uncertainty=share * (1.0 - share),
        within_variance=(squares - float(groups.records @ p**2)) / n,
        within_covariance=2.0 * (products - float(groups.events @ p)) / n,
    )
