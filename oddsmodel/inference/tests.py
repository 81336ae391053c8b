"""Likelihood-ratio tests of nested fits."""

from __future__ import annotations

from scipy.special import chdtrc

from oddsmodel.inference.maximise import Fit


def chi_square_p(statistic: float, df: int) -> float:
    """Upper tail of the chi-square distribution."""
    return float(chdtrc(df, statistic))


def likelihood_ratio(full: Fit, restricted: Fit) -> tuple[float, int, float]:
    """Statistic 2(l_full - l_restricted), its degrees of freedom, and p by chi-square (Wilks 1938).

    Both fits must be of one likelihood, the restricted space inside the full one. A difference below zero by
    rounding counts as zero. Raises ValueError where the spaces have equal dimension.
    """
    df = full.dimension - restricted.dimension
    if df < 1:
        raise ValueError("the restricted fit must have fewer dimensions than the full one")
    statistic = max(0.0, 2.0 * (full.log_likelihood - restricted.log_likelihood))
    return statistic, df, chi_square_p(statistic, df)
