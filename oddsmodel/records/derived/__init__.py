"""Columns made from others, as the plan says: bands, years between dates, points, groups and quantile groups."""

from oddsmodel.records.derived.derive import Derived, Deriving, derive, faults_of_derived_names

__all__ = ["Derived", "Deriving", "derive", "faults_of_derived_names"]
