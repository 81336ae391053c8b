"""Maximum penalised likelihood: the highest maximum that two searches from opposite ends find."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from oddsmodel.inference.maximise import Fit, Problem, maximise_all
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.base import Array
from oddsmodel.likelihood.penalised import JeffreysPenalisedLikelihood

WEAKER = (1.0 / 16.0, 1.0 / 4.0)
"""Shares of the penalty's power with which the second search begins."""

SAME_PLACE = 1e-4
"""Distance, in standard errors, within which two searches have ended at one maximum."""


@dataclass(frozen=True)
class PenalisedFit:
    """fit: at the highest maximum found. lower_maximum: another one, where the other search ended there."""

    fit: Fit
    lower_maximum: Fit | None


def maximise_penalised(
    likelihood: JeffreysPenalisedLikelihood, *, basis: Array | None = None, origin: Array | None = None
) -> PenalisedFit:
    """The maximum of a penalised likelihood over beta = origin + basis h (all of beta where both are None).

    The value is not concave, so a point where Newton's method settles is a local maximum and perhaps not the only one.
    Two searches set out from opposite ends. The penalty alone is largest at beta = 0; the likelihood alone is largest
    at its own maximum, finite or not. One search begins at zero. The other begins with a sixteenth, then a quarter of
    the penalty, each from the maximum before, and so comes from the likelihood's side. The higher end is taken; where
    the ends differ, the lower one is given too, because limits and tests around the higher one may then mislead.

    The fit's `covariance` is the inverse of the expected information at the maximum (Heinze & Schemper 2002, section
    2), its `working_information` minus the Hessian of the penalised value, as profile limits need it. A fit that has
    not settled comes back with its status, as from `maximise`.
    """
    from_zero, start = _maximise(likelihood, basis, origin, None), None
    if from_zero.status == "aliased":
        return PenalisedFit(from_zero, None)
    for share in WEAKER:
        weaker = _maximise(likelihood.with_power(share * likelihood.power), basis, origin, start)
        start = weaker.coefficients
    ends = [from_zero, _maximise(likelihood, basis, origin, start)]
    settled = sorted((end for end in ends if end.status == "converged"), key=lambda end: -end.log_likelihood)
    if not settled:
        return PenalisedFit(from_zero, None)
    best = settled[0]
    lower = next((end for end in settled[1:] if _distance(best, end) > SAME_PLACE), None)
    if lower is None and from_zero.status == "converged":
        best = from_zero
    return PenalisedFit(
        _with_expected_covariance(best, basis), None if lower is None else _with_expected_covariance(lower, basis)
    )


def _maximise(
    likelihood: JeffreysPenalisedLikelihood, basis: Array | None, origin: Array | None, start: Array | None
) -> Fit:
    return maximise_all(likelihood, [Problem(basis, origin, start)])[0]


def _distance(one: Fit, other: Fit) -> float:
    """How far apart two fits are, in standard errors of the first."""
    apart = other.working - one.working
    return float(np.sqrt(np.maximum(0.0, apart @ one.working_information @ apart)))


def _with_expected_covariance(fit: Fit, basis: Array | None) -> Fit:
    """The fit with the inverse of the likelihood's expected information, on the space of the basis, as covariance."""
    space, working = fit.space, fit.space.working
    if not isinstance(working, JeffreysPenalisedLikelihood):
        raise TypeError("a fit of a penalised likelihood is needed")
    information = working.expected_information(fit.working)
    if basis is None:
        covariance = solve(information, np.eye(information.shape[0]))
    else:
        moved = space.gamma(np.asarray(basis, dtype=np.float64).T).T
        reduced = moved.T @ information @ moved
        covariance = moved @ solve(reduced, np.eye(reduced.shape[0])) @ moved.T
    if space.to_beta is not None and space.from_beta is not None:
        covariance = space.to_beta @ covariance @ space.to_beta.T
        information = space.from_beta.T @ information @ space.from_beta
    return replace(fit, information=information, covariance=(covariance + covariance.T) / 2.0)
