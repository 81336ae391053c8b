"""Exact test that several coefficients, those of one term, are all zero."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.exact.budget import Budget
from oddsmodel.inference.exact.distribution import ConditionalDistribution, conditional_distribution
from oddsmodel.inference.exact.tilted import TIED, p_no_more_probable
from oddsmodel.likelihood.base import Array
from oddsmodel.progress import Progress


@dataclass(frozen=True, eq=False)
class ExactJointTest:
    """score: the conditional score statistic (t - E)'V⁻¹(t - E) at zero coefficients, on df degrees of freedom (the
    dimension in which the sums can move). p_score: the probability of a statistic at least as large; p_by_probability:
    that of all values no more probable than the observed one. All None where only one value is possible (df 0).
    """

    score: float | None
    df: int
    p_score: float | None
    p_by_probability: float | None
    distribution: ConditionalDistribution


def exact_joint_test(
    X: Array,
    events: Array,
    trials: Array,
    positions: Sequence[int],
    *,
    strata: NDArray[np.generic] | None = None,
    budget: Budget | None = None,
    progress: Progress | None = None,
) -> ExactJointTest:
    """Exact conditional score and probability test of the columns `positions` of X; see `conditional_distribution`.

    Mehta & Patel 1995, Statistics in Medicine 14:2143-2160. The p-value of the score statistic is from its
    exact distribution, not from chi-square. Raises as `conditional_distribution` does.
    """
    distribution = conditional_distribution(
        X, events, trials, positions, strata=strata, budget=budget, progress=progress
    )
    if len(distribution.log_weight) == 1:
        return ExactJointTest(None, 0, None, None, distribution)
    probability = np.exp(distribution.log_weight - distribution.log_weight.max())
    probability /= probability.sum()
    size = np.abs(distribution.distance).max(axis=0)
    distance = distribution.distance[:, size > 0] / size[size > 0]
    deviation = distance - probability @ distance
    variance = (deviation * probability[:, None]).T @ deviation
    inverse = np.linalg.pinv(variance, rcond=1e-10, hermitian=True)
    score = np.einsum("si,ij,sj->s", deviation, inverse, deviation)
    observed = float(score[distribution.place])
    as_large = score >= observed - TIED * max(1.0, observed)
    return ExactJointTest(
        score=observed,
        df=int(np.linalg.matrix_rank(variance, tol=1e-10 * float(np.trace(variance)), hermitian=True)),
        p_score=min(1.0, math.fsum(probability[as_large])),
        p_by_probability=p_no_more_probable(distribution.log_weight, distribution.place),
        distribution=distribution,
    )
