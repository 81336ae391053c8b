"""Which study designs take their records by the outcome."""

from __future__ import annotations

CASE_CONTROL = ("case-control", "matched case-control")
"""Designs without a risk, a share of events or an interpreted intercept."""
