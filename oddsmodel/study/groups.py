"""Records that belong to groups: what is said of how many there are, and Wald's test of several coefficients."""

from __future__ import annotations

import numpy as np
from scipy.linalg import null_space
from scipy.special import fdtrc

from oddsmodel.findings import Finding
from oddsmodel.inference import maximise
from oddsmodel.inference.clustered import clustered_covariance, small_sample_factor
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.model.grouped import Grouping
from oddsmodel.results.study import Flow, WaldTest
from oddsmodel.wording import finding

ENOUGH = 40
"""Below this many groups a cluster-robust interval tends to be too narrow (Cameron & Miller 2015, section VI)."""

VERY_FEW = 10


def findings_of_groups(grouping: Grouping, flow: Flow) -> tuple[Finding, ...]:
    """How many records are of how many groups, and the caution where the groups are few."""
    facts = {"column": grouping.label, "groups": grouping.number}
    told = finding("note", "records-of-groups", records=flow.analysed, **facts)
    if grouping.number < VERY_FEW:
        return (told, finding("caution", "groups-too-few", **facts, enough=ENOUGH))
    if grouping.number < ENOUGH:
        return (told, finding("caution", "groups-few", **facts, enough=ENOUGH))
    return (told,)


def contrasts_without(model: FittedModel, columns: tuple[int, ...]) -> tuple[Array, Array, int] | None:
    """Estimates (r,) and cluster-robust covariance (r, r) of the model of these columns, and the degrees of freedom.

    None where the groups are too few, or where a column has no standard error.
    """
    grouping, patterns = model.grouping, model.patterns
    if grouping is None or grouping.covariance is None or grouping.without_error[list(columns)].any():
        return None
    if len(columns) == len(model.design.columns):
        return model.fit.coefficients, grouping.covariance, grouping.df
    fit = maximise(BinomialLikelihood(patterns.X[:, list(columns)], patterns.events, trials=patterns.trials))
    factor = small_sample_factor(grouping.number, float(model.records), len(columns))
    if fit.status != "converged" or factor is None:
        return None
    covariance = clustered_covariance(fit, patterns.index, model.event, grouping.codes, factor, model.counts)
    return fit.coefficients, covariance, grouping.df


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
