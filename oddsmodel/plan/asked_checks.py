"""The checks that a plan may ask for beyond those always done; each is a file of its name among the checks."""

from __future__ import annotations

ASKED_CHECKS: tuple[str, ...] = (
    "goodness_of_fit",
    "half_normal",
    "fractional_polynomials",
    "box_tidwell",
    "quantile_groups",
    "interactions",
    "condition_indices",
    "specification_stability",
    "calibration_error",
    "discrimination",
    "internal_validation",
    "sample_size_for_prediction",
)
"""In the order in which they are done."""

FOR_PREDICTION: tuple[str, ...] = ("internal_validation", "sample_size_for_prediction")
"""Those of them that are also done where the aim is prediction."""
