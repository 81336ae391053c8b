"""Maximising, profile limits, tests, separation and certificates, written once above every likelihood."""

from oddsmodel.inference.certificate import Certificate, certify
from oddsmodel.inference.exact import (
    BeyondBudget,
    Budget,
    ExactInference,
    ExactJointTest,
    ManyValuedColumn,
    exact_inference,
    exact_joint_test,
)
from oddsmodel.inference.finite_part import FinitePart, finite_part
from oddsmodel.inference.maximise import Fit, Problem, maximise, maximise_all
from oddsmodel.inference.one_sided_limit import OneSidedLimit, one_sided_limits
from oddsmodel.inference.profile import ProfileLimits, profile, profile_intervals
from oddsmodel.inference.separation import Separation, separation, separation_of, separation_of_differences
from oddsmodel.inference.tests import likelihood_ratio

__all__ = [
    "BeyondBudget",
    "Budget",
    "Certificate",
    "ExactInference",
    "ExactJointTest",
    "FinitePart",
    "Fit",
    "ManyValuedColumn",
    "OneSidedLimit",
    "Problem",
    "ProfileLimits",
    "Separation",
    "certify",
    "exact_inference",
    "exact_joint_test",
    "finite_part",
    "likelihood_ratio",
    "maximise",
    "maximise_all",
    "one_sided_limits",
    "profile",
    "profile_intervals",
    "separation",
    "separation_of",
    "separation_of_differences",
]
