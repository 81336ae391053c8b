"""Wald's F of several coefficients, where records are grouped and have no likelihood."""

from __future__ import annotations

import numpy as np
from scipy.linalg import null_space
from scipy.special import fdtrc

from oddsmodel.inference.clustered import clustered_covariance, small_sample_factor
from oddsmodel.inference.maximise import Fit, maximise
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.study import WaldTest


def covariance_of(model: FittedModel, fit: Fit) -> Array | None:
    """The cluster-robust covariance of another fit to the patterns of a model whose records are grouped, or None."""
    grouping = model.grouping
    if grouping is None or fit.status != "converged":
        return None
    factor = small_sample_factor(grouping.number, float(model.records), fit.coefficients.size)
    if factor is None:
        return None
    held, patterns = model.grouped
    return clustered_covariance(fit, patterns.index, held.event, grouping.codes, factor, held.counts)


def contrasts_without(model: FittedModel, columns: tuple[int, ...]) -> tuple[Array, Array, int] | None:
    """Estimates (r,) and cluster-robust covariance (r, r) of the model of these columns, and the degrees of freedom.

    None where the groups are too few, or where a column has no standard error.
    """
    grouping = model.grouping
    if (
        grouping is None
        or grouping.covariance is None
        or grouping.df is None
        or grouping.without_error[list(columns)].any()
    ):
        return None
    if len(columns) == len(model.design.columns):
        return model.fit.coefficients, grouping.covariance, grouping.df
    _, patterns = model.grouped
    fit = maximise(BinomialLikelihood(patterns.X[:, list(columns)], patterns.events, trials=patterns.trials))
    covariance = covariance_of(model, fit)
    return None if covariance is None else (fit.coefficients, covariance, grouping.df)


def wald_f(estimates: Array, covariance: Array, df: int, within: Array) -> WaldTest | None:
    """F of the hypothesis that the estimates (r,) lie in the space spanned by within (r, s).

    With L'b = 0 that hypothesis, F = (L'b)'(L'VL)⁻¹(L'b) / q on q = rank of L and `df` degrees of freedom (Cameron &
    Miller 2015, section VI.D). None where q exceeds df: as many groups cannot tell of so many coefficients at once.
    """
    scale = np.sqrt(np.diag(covariance))
    if not (scale > 0.0).all():
        return None
    b, V = estimates / scale, covariance / np.outer(scale, scale)
    L = null_space((within / scale[:, None]).T) if within.shape[1] else np.eye(b.size)
    q = L.shape[1]
    if q == 0 or q > df:
        return None
    middle = L.T @ V @ L
    if np.linalg.cond(middle) > 1e12:
        return None
    told = L.T @ b
    statistic = float(told @ np.linalg.solve(middle, told)) / q
    return WaldTest(statistic, q, df, float(fdtrc(q, df, statistic)))
