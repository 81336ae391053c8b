"""Which interval leads, and how it stands in a table."""

from __future__ import annotations

from oddsmodel.results.study import CoefficientResult, ProfileResult, WaldResult
from oddsmodel.results.tables import Cell, Interval


def lead_interval(profile: ProfileResult | None, wald: WaldResult | None) -> Cell:
    """The profile limits where there is one, else the Wald limits; an empty cell where there is neither."""
    for limits in (profile, wald):
        if limits is not None and not (limits.lower is None and limits.upper is None):
            return Interval(limits.lower, limits.upper)
    return None


def interval_of(one: CoefficientResult) -> Cell:
    """The interval of a coefficient that leads: its exact limits where it has them."""
    if one.exact is not None:
        return Interval(one.exact.lower, one.exact.upper)
    return lead_interval(one.profile, one.wald)
