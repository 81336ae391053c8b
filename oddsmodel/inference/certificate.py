"""What a fit's numbers are worth: correct digits claimed from a score in extended precision."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import LinAlgError, cholesky

from oddsmodel.inference.maximise import Fit
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.base import Array

MOST_REFINEMENTS = 4
MOST_DIGITS = 15.0
"""No more is claimed for a number held in double precision."""


@dataclass(frozen=True)
class Certificate:
    """fit: with its coefficients refined. digits (p,): correct significant digits of each coefficient, relative to
    max(|beta|, standard error). condition_number: of the information scaled to a unit diagonal. decrement: the
    squared Newton decrement at the refined coefficients, from the score in extended precision."""

    fit: Fit
    digits: Array
    condition_number: float
    decrement: float


def certify(fit: Fit) -> Certificate:
    """Refine a converged fit by the score in extended precision and say how many digits are then certain.

    With beta held in extended precision, beta <- beta + I^-1 s(beta) is repeated until the step no longer
    shrinks (iterative refinement: Wilkinson 1963; Higham 2002, chapter 12). The last step d bounds the error of
    the iterate before it, and contracts; what is left is bounded by

        |error_j| <= 2 |d_j| + standard error_j * r,

    where r is the effect of rounding in the extended score: n rows of p products each lose at most a few units
    of the extended precision, which moves the score in whitened coordinates by eps * p * sqrt(sum of the
    squared products). The digits are -log10 of the bound over max(|beta_j|, standard error_j), at most 15.

    Raises ValueError where the fit has not converged on the whole space.
    """
    if fit.status != "converged" or fit.dimension != fit.coefficients.size:
        raise ValueError("only a converged fit of all coefficients can be certified")
    space = fit.space
    precise = fit.working.astype(np.longdouble)
    beta = precise if space.to_beta is None else space.to_beta.astype(np.longdouble) @ precise
    step = np.full(beta.size, np.inf)
    decrement = np.inf
    for _ in range(MOST_REFINEMENTS):
        score = fit.likelihood.extended_score(beta)
        next_step, decrement = _newton_step(fit, score)
        if not np.abs(next_step / fit.standard_errors).max() < 0.5 * np.abs(step / fit.standard_errors).max():
            break
        step = next_step
        beta = beta + step
        if np.abs(step / fit.standard_errors).max() < 1e-15:
            break
    coefficients = beta.astype(np.float64)
    rounding = _rounding(fit, coefficients)
    bound = 2.0 * np.abs(next_step) + fit.standard_errors * rounding
    size = np.maximum(np.abs(coefficients), fit.standard_errors)
    digits = np.clip(-np.log10(np.maximum(bound / size, 10.0**-MOST_DIGITS)), 0.0, MOST_DIGITS)
    working = space.gamma(coefficients) if space.to_beta is None else np.asarray(precise, dtype=np.float64)
    return Certificate(
        replace(fit, coefficients=coefficients, working=working), digits, condition_number(fit), decrement
    )


def _newton_step(fit: Fit, score: NDArray[np.longdouble]) -> tuple[Array, float]:
    """The step I^-1 s for a score in beta coordinates, and the squared decrement s'I^-1 s."""
    to_beta = fit.space.to_beta
    if to_beta is None:
        step = solve(fit.working_information, np.asarray(score, dtype=np.float64))
        return step, float(step @ np.asarray(score, dtype=np.float64))
    working_score = np.asarray(to_beta.astype(np.longdouble).T @ score, dtype=np.float64)
    working_step = solve(fit.working_information, working_score)
    return to_beta @ working_step, float(working_step @ working_score)


def _rounding(fit: Fit, coefficients: Array) -> float:
    """Relative effect, in standard errors, of rounding in the extended score and in the linear predictor.

    The largest product |x_ij beta_j| is at most the root of the gram matrix's diagonal times |beta_j|, whatever
    the row; its rounding moves the risk of that row by a quarter of itself.
    """
    gram = np.diag(fit.likelihood.gram())
    eps = float(np.finfo(np.longdouble).eps)
    products = float(np.sqrt(gram) @ np.abs(coefficients))
    return eps * (coefficients.size + 4) * (products + float(np.sqrt(fit.likelihood.rows)))


def condition_number(fit: Fit) -> float:
    """Condition number of the information matrix scaled to a unit diagonal (2-norm)."""
    try:
        root = cholesky(fit.working_information)
    except LinAlgError:
        return float("inf")
    if fit.space.from_beta is not None:
        root = root @ fit.space.from_beta
    values = np.linalg.svd(root / np.sqrt((root**2).sum(axis=0)), compute_uv=False)
    return float((values[0] / values[-1]) ** 2) if values[-1] > 0 else float("inf")
