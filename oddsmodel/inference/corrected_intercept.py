"""Intercepts of penalised fits from which risks may be predicted: FLIC and FLAC."""

from __future__ import annotations

import numpy as np

from oddsmodel.inference.maximise import Fit, Problem, maximise, maximise_all
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.base import Array
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.likelihood.logistic import logistic


def flic(likelihood: BinomialLikelihood, coefficients: Array, constant: int) -> float | None:
    """The intercept by maximum likelihood with all other coefficients (p,) kept as the penalised ones.

    The average predicted risk is then the share of events observed ("FLIC": Puhr, Heinze, Nold, Lusa & Geroldinger
    2017, Statistics in Medicine 36:2302-2317, section 3.2). constant: the place of the intercept. None where it does
    not settle.
    """
    basis = np.zeros((coefficients.size, 1))
    basis[constant] = 1.0
    origin = np.where(np.arange(coefficients.size) == constant, 0.0, coefficients)
    fit = maximise_all(likelihood, [Problem(basis, origin, coefficients)])[0]
    return float(fit.coefficients[constant]) if fit.status == "converged" else None


def flac(likelihood: BinomialLikelihood, penalised: Fit) -> Array | None:
    """All coefficients (p,) from records augmented by pseudo-records, which a column of its own keeps apart.

    Every row gets h/2 events and h/2 others more among pseudo-records, h its hat value at the penalised estimates
    (with which the penalised score equations are those of maximum likelihood), and an added column, 1 for pseudo-
    records and 0 else, takes up what they say of the average risk ("FLAC": the same paper, section 3.3). Rows in
    memory. None where it does not settle.
    """
    X, events, trials = likelihood.rows_apart()
    small, whole, _ = logistic(X @ penalised.coefficients)
    plain = likelihood.evaluate(penalised.coefficients[None, :])
    if plain.information is None:
        raise TypeError("hat values need the information")
    reach = np.einsum("ij,ji->i", X, solve(plain.information[0], X.T))
    hat = trials * small / (whole * whole) * reach
    n, p = X.shape
    augmented = np.zeros((2 * n, p + 1))
    augmented[:n, :p] = augmented[n:, :p] = X
    augmented[n:, p] = 1.0
    both = BinomialLikelihood(augmented, np.concatenate([events, hat / 2.0]), trials=np.concatenate([trials, hat]))
    fit = maximise(both)
    return fit.coefficients[:p] if fit.status == "converged" else None
