"""One profile limit by refitting at fixed values between brackets: slow, and sure on a concave likelihood."""

from __future__ import annotations

from typing import Literal

import numpy as np
from scipy.linalg import null_space

from oddsmodel.inference.maximise import Fit, Problem, maximise_all
from oddsmodel.likelihood.base import Array

MOST_DOUBLINGS = 40


class _NotSettled(ArithmeticError):
    """A refit found no maximum at a fixed theta."""


def search_limit(
    fit: Fit, contrast: Array, sign: float, height: float, first_step: float
) -> tuple[float, Literal["found", "no finite limit", "not found"]]:
    """The theta = contrast'gamma beyond the maximum on the side `sign` where the profile reaches `height`.

    contrast (p,) is in the fit's working coordinates. The profile log-likelihood of a concave likelihood falls
    steadily away from its maximum, so a bracket found by doubling holds exactly one root, refined by Brent's
    method. Where doubling never reaches the height, the profile is flat and there is no finite limit. A refit that
    does not settle from its neighbour's place is begun again from the maximum; where that fails too, the limit is
    not found.
    """
    from scipy.optimize import brentq

    centre = float(contrast @ fit.working)
    slice_basis = null_space(contrast[None, :])
    direction = contrast / float(contrast @ contrast)
    warm: Array = fit.working
    known = {centre: fit.log_likelihood - height}

    def above(theta: float) -> float:
        nonlocal warm
        if theta in known:
            return known[theta]
        moved = fit.working + (theta - centre) * direction
        start = warm + (theta - float(contrast @ warm)) * direction
        for begin in (start, moved):
            refit = maximise_all(fit.space.working, [Problem(slice_basis, moved, begin)])[0]
            if refit.status in ("converged", "no finite maximum"):
                warm = refit.coefficients
                known[theta] = refit.log_likelihood - height
                return known[theta]
        raise _NotSettled

    near, far = centre, centre + sign * first_step
    try:
        for _ in range(MOST_DOUBLINGS):
            if above(far) < 0.0:
                break
            near, far = far, centre + 2.0 * (far - centre)
        else:
            return sign * np.inf, "no finite limit"
        theta, outcome = brentq(above, near, far, xtol=1e-12 * max(1.0, abs(first_step)), full_output=True)
    except _NotSettled:
        return np.nan, "not found"
    return float(theta), "found" if outcome.converged else "not found"
