"""Intercepts of penalised fits from which risks may be predicted: FLIC and FLAC."""

from __future__ import annotations

import numpy as np

from oddsmodel.inference.maximise import Fit, Problem, maximise, maximise_all
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.base import Array
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import Leaf


def flic(likelihood: BinomialLikelihood, coefficients: Array, constant: int) -> float | None:
    """The intercept by maximum likelihood with all other coefficients (p,) kept as the penalised ones.

    The average predicted risk is then the share of events observed ("FLIC": Puhr, Heinze, Nold, Lusa & Geroldinger
    2017, Statistics in Medicine 36:2302-2317). constant: the place of the intercept. None where all
    records or none have the event, so that no intercept gives their share.
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
    records and 0 else, takes up what they say of the average risk ("FLAC": the same paper). Where the
    model has an intercept, the average predicted risk of the records is then the share of events observed.

    likelihood: of the same rows without the penalty; penalised: its penalised fit, converged. The rows are brought into
    memory, twice. None where all records or none have the event.
    """
    space = penalised.space
    plain = likelihood if space.to_beta is None else likelihood.transformed(space.to_beta)
    information = plain.evaluate(penalised.working[None, :]).information
    if information is None:
        raise TypeError("hat values need the information")
    inverse = solve(information[0], np.eye(len(information[0])))
    tasks = list(plain.passes.each(_with_hat_values, (penalised.working, inverse)))
    X, events, trials, offset, hat = (np.concatenate(parts) for parts in zip(*tasks, strict=True))
    twice = np.zeros((2 * len(X), X.shape[1] + 1))
    twice[: len(X), :-1] = twice[len(X) :, :-1] = X
    twice[len(X) :, -1] = 1.0
    both = BinomialLikelihood(
        twice, np.concatenate([events, hat / 2.0]), np.concatenate([trials, hat]), np.tile(offset, 2)
    )
    fit = maximise(both)
    return space.beta(fit.coefficients[:-1]) if fit.status == "converged" else None


def _with_hat_values(rows: Leaf, first: int, state: tuple[Array, Array]) -> tuple[Array, Array, Array, Array, Array]:
    """X, events, trials, offset and n mu (1 - mu) x'I^-1 x of the rows, from coefficients and inverse information."""
    beta, inverse = state
    X, events = rows["X"], rows["events"]
    trials, offset = rows.get("trials", np.ones(len(X))), rows.get("offset", np.zeros(len(X)))
    small, whole, _ = logistic(X @ beta + offset)
    hat = trials * small / (whole * whole) * np.einsum("ij,ij->i", X @ inverse, X)
    return X, events, trials, offset, hat
