"""Columns made from others, as the plan says: bands, years between dates, points, groups and quantile groups."""

from oddsmodel.records.derived.derive import Derived, derive

__all__ = ["Derived", "derive"]
