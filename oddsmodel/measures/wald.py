"""Wald intervals and tests of single coefficients, from an estimate and its standard error."""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy.special import ndtr, ndtri, stdtr, stdtrit


@dataclass(frozen=True, slots=True)
class Wald:
    """Limits on the scale of the estimate, and the two-sided p-value of the hypothesis that it is 0."""

    lower: float
    upper: float
    p: float


def t_quantile(level: float, df: float) -> float:
    """The t with probability `level` between -t and t under Student's distribution."""
    if not 0.0 < level < 1.0 or not df > 0.0:
        raise ValueError("a confidence level lies between 0 and 1, and degrees of freedom above 0")
    return float(stdtrit(df, (1.0 + level) / 2.0))


def normal_quantile(level: float) -> float:
    """The z with probability `level` between -z and z under the standard normal distribution."""
    if not 0.0 < level < 1.0:
        raise ValueError("a confidence level lies between 0 and 1")
    return float(-ndtri((1.0 - level) / 2.0))


def wald(estimate: float, standard_error: float, level: float = 0.95, df: float | None = None) -> Wald:
    """Estimate ± z·standard error, and p = 2 Φ(−|estimate| / standard error) (Wald 1943).

    With degrees of freedom `df` Student's distribution takes the place of the normal one.

    The estimate is on the log-odds scale, as the limits then are. Raises ValueError where the estimate is not
    finite or the standard error not positive and finite: such a coefficient has no Wald interval.

    >>> limits = wald(math.log(1.832), 0.1228)
    >>> round(math.exp(limits.lower), 2), round(math.exp(limits.upper), 2)
    (1.44, 2.33)
    """
    if not math.isfinite(estimate) or not math.isfinite(standard_error) or standard_error <= 0.0:
        raise ValueError("a Wald interval needs a finite estimate and a positive, finite standard error")
    quantile = normal_quantile(level) if df is None else t_quantile(level, df)
    distance = -abs(estimate) / standard_error
    p = 2.0 * float(ndtr(distance) if df is None else stdtr(df, distance))
    reach = quantile * standard_error
    return Wald(lower=estimate - reach, upper=estimate + reach, p=p)


def standard_error_from_ratios(lower: float, upper: float, level: float, df: float | None = None) -> float:
    """The standard error of a log odds ratio, from its Wald limits on the odds-ratio scale."""
    quantile = normal_quantile(level) if df is None else t_quantile(level, df)
    return (math.log(upper) - math.log(lower)) / (2.0 * quantile)
