"""Exact conditional inference for small data: from all outcomes that have the observed sums."""

from oddsmodel.inference.exact.budget import BeyondBudget, Budget
from oddsmodel.inference.exact.coefficient import ExactInference, exact_inference
from oddsmodel.inference.exact.distribution import ConditionalDistribution, conditional_distribution
from oddsmodel.inference.exact.joint import ExactJointTest, exact_joint_test
from oddsmodel.inference.exact.whole_numbers import ManyValuedColumn

__all__ = [
    "BeyondBudget",
    "Budget",
    "ConditionalDistribution",
    "ExactInference",
    "ExactJointTest",
    "ManyValuedColumn",
    "conditional_distribution",
    "exact_inference",
    "exact_joint_test",
]
