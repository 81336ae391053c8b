"""Exact inference for one coefficient of a logistic model."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.exact.budget import Budget
from oddsmodel.inference.exact.distribution import ConditionalDistribution, conditional_distribution
from oddsmodel.inference.exact.tilted import Tilted
from oddsmodel.likelihood.base import Array
from oddsmodel.progress import Progress

ExactStatus = Literal["finite", "plus infinity", "minus infinity", "no information"]


@dataclass(frozen=True, eq=False)
class ExactInference:
    """What the exact conditional distribution says of one coefficient; everything on the log-odds scale.

    status: "plus infinity" or "minus infinity" where the observed sum is the greatest or least possible, so that the
    conditional likelihood rises without end; "no information" where the sum can have no other value than the observed
    one, and every number is None.

    estimate: the conditional maximum-likelihood estimate, None unless it is finite. median_unbiased: always finite.
    lower, upper: exact limits, each from a one-sided test at half of 1 - level; None where there is no limit on that
    side. mid_p_lower, mid_p_upper: those of the mid-P tests, in which half of the probability of the observed value
    counts. p_doubled: twice the smaller tail, at most 1; p_by_probability: the values no more probable than the
    observed one; p_mid: twice the smaller tail with half of the observed value's probability, at most 1.
    """

    status: ExactStatus
    estimate: float | None
    median_unbiased: float | None
    lower: float | None
    upper: float | None
    mid_p_lower: float | None
    mid_p_upper: float | None
    p_doubled: float | None
    p_by_probability: float | None
    p_mid: float | None
    distribution: ConditionalDistribution


def exact_inference(
    X: Array,
    events: Array,
    trials: Array,
    position: int,
    *,
    strata: NDArray[np.generic] | None = None,
    level: float = 0.95,
    budget: Budget | None = None,
    progress: Progress | None = None,
) -> ExactInference:
    """Exact conditional inference for the coefficient of column `position` of X (m, p); see `conditional_distribution`.

    Estimate, limits and tests: Hirji, Mehta & Patel 1987, JASA 82:1110-1117; Mehta & Patel 1995, Statistics in
    Medicine 14:2143-2160; median-unbiased estimate: Hirji, Tsiatis & Mehta 1989; mid-P: Lancaster 1961, JASA
    56:223-234.

    Raises ManyValuedColumn, BeyondBudget; ValueError where level is not between 0 and 1 or arrays do not fit.
    """
    if not 0.0 < level < 1.0:
        raise ValueError("level must lie between 0 and 1")
    distribution = conditional_distribution(
        X, events, trials, [position], strata=strata, budget=budget, progress=progress
    )
    if len(distribution.log_weight) == 1:
        return ExactInference("no information", *(None,) * 9, distribution)
    tilted = Tilted(distribution.distance[:, 0], distribution.log_weight, distribution.place)
    tail = (1.0 - level) / 2.0
    status: ExactStatus = "plus infinity" if tilted.at_last else "minus infinity" if tilted.at_first else "finite"
    return ExactInference(
        status=status,
        estimate=tilted.estimate(),
        median_unbiased=tilted.median_unbiased(),
        lower=tilted.lower_limit(tail, 1.0),
        upper=tilted.upper_limit(tail, 1.0),
        mid_p_lower=tilted.lower_limit(tail, 0.5),
        mid_p_upper=tilted.upper_limit(tail, 0.5),
        p_doubled=tilted.p_doubled(1.0),
        p_by_probability=tilted.p_by_probability(),
        p_mid=tilted.p_doubled(0.5),
        distribution=distribution,
    )
