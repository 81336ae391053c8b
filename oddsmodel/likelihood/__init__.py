"""What the model says about the coefficients, for many coefficient vectors at once."""

from oddsmodel.likelihood.base import Evaluation, Likelihood
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.likelihood.log_f import LogFLikelihood
from oddsmodel.likelihood.penalised import JeffreysPenalisedLikelihood

__all__ = ["BinomialLikelihood", "Evaluation", "JeffreysPenalisedLikelihood", "Likelihood", "LogFLikelihood"]
