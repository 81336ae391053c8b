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
from oddsmodel.inference.maximise import Fit, Problem, maximise, maximise_all
from oddsmodel.inference.profile import ProfileLimits, profile, profile_intervals
from oddsmodel.inference.separation import Separation, separation
from oddsmodel.inference.tests import likelihood_ratio

__all__ = [
    "BeyondBudget",
    "Budget",
    "Certificate",
    "ExactInference",
    "ExactJointTest",
    "Fit",
    "ManyValuedColumn",
    "Problem",
    "ProfileLimits",
    "Separation",
    "certify",
    "exact_inference",
    "exact_joint_test",
    "likelihood_ratio",
    "maximise",
    "maximise_all",
    "profile",
    "profile_intervals",
    "separation",
]
