"""The covariance of a maximum-likelihood estimate whose records are independent between groups, not within them."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import LinAlgError, cho_factor, cho_solve
from scipy.special import expit

from oddsmodel.inference.maximise import Fit
from oddsmodel.likelihood.base import Array

Index = NDArray[np.intp]


def small_sample_factor(groups: int, records: float, parameters: int) -> float | None:
    """G/(G − 1) · (n − 1)/(n − p), "CR1" of Cameron & Miller 2015; None with fewer than two groups or n <= p."""
    if groups < 2 or records <= parameters:
        return None
    return groups / (groups - 1.0) * (records - 1.0) / (records - parameters)


def clustered_covariance(
    fit: Fit, index: Index, event: NDArray[np.bool_], groups: Index, factor: float, counts: Array | None = None
) -> Array:
    """c · I⁻¹ (sum over groups g of s_g s_g') I⁻¹ (p, p), s_g the sum of the scores of the records of group g.

    Liang & Zeger 1986, Biometrika 73:13-22, equation (7) with independence as working correlation; the factor c is
    that of Cameron & Miller 2015, Journal of Human Resources 50:317-372, section II.B. The scores are those of the
    records, x_i (y_i − p_i): records of one covariate pattern may belong to several groups, so that a residual of the
    pattern's total would not do.

    fit: converged, on the whole space, its rows the m covariate patterns (or the records). index (n,): the row of each
    record; event (n,); groups (n,): whole numbers from 0; counts (n,): true frequencies, 1 where None.
    """
    X, _, _ = fit.space.working.rows_apart()
    residual = event - expit(X @ fit.working)[index]
    if counts is not None:
        residual = residual * counts
    number = int(groups.max()) + 1
    sums = np.empty((number, X.shape[1]))
    for column in range(X.shape[1]):
        sums[:, column] = np.bincount(groups, weights=residual * X[index, column], minlength=number)
    half = _solved(fit.working_information, sums.T)
    covariance = factor * (half @ half.T)
    if fit.space.to_beta is not None:
        covariance = fit.space.to_beta @ covariance @ fit.space.to_beta.T
    return np.asarray((covariance + covariance.T) / 2.0)


def within_one_group(indicator: NDArray[np.bool_], groups: Index) -> bool:
    """Whether the records that have something (n,), or those that lack it, all belong to one group.

    The score of an indicator adds up to zero over all records, so that one group's is zero too and the sum of squares
    says nothing of how groups differ: such a contrast has no cluster-robust standard error.
    """
    has, lacks = groups[indicator], groups[~indicator]
    return any(side.size > 0 and bool((side == side[0]).all()) for side in (has, lacks))


def _solved(information: Array, right: Array) -> Array:
    """information⁻¹ right, on a unit diagonal."""
    scale = np.sqrt(np.diag(information))
    try:
        solved = cho_solve(cho_factor(information / np.outer(scale, scale)), right / scale[:, None])
    except LinAlgError as error:
        raise ValueError("the information of a converged fit is positive definite") from error
    return np.asarray(solved / scale[:, None])
