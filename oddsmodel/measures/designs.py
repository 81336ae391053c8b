"""What each study design allows to be said."""

from __future__ import annotations

CASE_CONTROL = ("case-control", "matched case-control")
"""Designs that take their records by the outcome: no risk, no share of events, no interpreted intercept."""

QUANTITY = {"cohort": "risk", "trial": "risk", "cross-sectional": "prevalence"}
"""What the share of events is called in each design that has one."""
