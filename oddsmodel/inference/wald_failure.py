"""Where Wald tests fail: estimates so large that the Wald statistic falls as the effect grows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.maximise import Fit
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.base import Array, InformationLikelihood


@dataclass(frozen=True)
class WaldFailure:
    """statistic (p,): each coefficient over its standard error, z.

    slope (p,): the derivative of z in its coefficient, times the standard error: 1 where the standard error does not
    depend on the coefficient, 0 where z is largest, below 0 where a larger effect gives a smaller z.
    """

    statistic: Array
    slope: Array

    @property
    def falling(self) -> NDArray[np.bool_]:
        """Whether each statistic (p,) is past its largest value, so that its test says less of larger effects."""
        return np.asarray(self.slope < 0.0)


def wald_failure(fit: Fit) -> WaldFailure:
    """The effect of Hauck & Donner 1977 (Journal of the American Statistical Association 72:851-853), coefficient by
    coefficient, by the derivative of Yee 2022 (Journal of the American Statistical Association 117:1763-1774).

    With v_j the element j of the diagonal of the inverse information, z_j = beta_j / v_j^1/2, and all other
    coefficients held at their estimates,

        v_j^1/2 dz_j/dbeta_j = 1 - beta_j v_j' / (2 v_j),    v_j' = - (I^-1 dI/dbeta_j I^-1)_jj.

    One pass over the rows, no refits. The comparison is with an odds ratio of 1, and holds for the given reference
    levels: another reference makes other coefficients. Raises ValueError where the fit has not converged on the whole
    space, TypeError where its likelihood does not say how its information changes.
    """
    if fit.status != "converged" or fit.dimension != fit.coefficients.size:
        raise ValueError("only a converged fit of all coefficients can be judged")
    space, likelihood = fit.space, fit.space.working
    if not isinstance(likelihood, InformationLikelihood):
        raise TypeError("the likelihood does not say how its information changes with the coefficients")
    p = fit.coefficients.size
    contrasts = np.eye(p) if space.to_beta is None else space.to_beta
    ways = np.eye(p) if space.from_beta is None else space.from_beta
    spread = solve(fit.working_information, contrasts.T).T
    variance = (spread * contrasts).sum(axis=1)
    change = likelihood.trace_derivatives(np.tile(fit.working, (p, 1)), spread[:, :, None]).gradient
    changed = -(change * ways.T).sum(axis=1)
    slope = 1.0 - fit.coefficients * changed / (2.0 * variance)
    return WaldFailure(fit.coefficients / np.sqrt(variance), slope)
