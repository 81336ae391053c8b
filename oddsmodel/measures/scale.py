"""From the log-odds scale to the odds-ratio scale, with None where there is no finite number."""

from __future__ import annotations

import math

from oddsmodel.inference.profile import ProfileLimits
from oddsmodel.results.tables import Interval

LARGEST_LOG = 700.0
"""Logs beyond this, either way, have no odds ratio that a double can hold."""


def exponential(log_value: float) -> float | None:
    """exp, or None where the log is not finite or too large either way."""
    if not math.isfinite(log_value) or abs(log_value) > LARGEST_LOG:
        return None
    return math.exp(log_value)


def limits_on_ratio_scale(limits: ProfileLimits, position: int) -> Interval:
    """The profile limits of one contrast as odds ratios; None where a limit does not exist or was not found."""
    lower = exponential(float(limits.lower[position])) if limits.lower_status[position] == "found" else None
    upper = exponential(float(limits.upper[position])) if limits.upper_status[position] == "found" else None
    return Interval(lower, upper)
