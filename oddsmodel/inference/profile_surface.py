"""The log-likelihood around a fit in coordinates in which its information is the identity, whole or approximate."""

from __future__ import annotations

from typing import Protocol

import numpy as np
from scipy.linalg import LinAlgError, cholesky
from scipy.linalg.lapack import dtrtri

from oddsmodel.inference.maximise import Fit
from oddsmodel.likelihood.base import Array, Evaluation, Likelihood
from oddsmodel.passes import LEAF_ROWS

THIN_FROM = 65_536
"""From so many rows on, profile limits start from an evenly spaced part of them."""

FEWEST_LEAVES, MOST_LEAVES, SHARE = 3, 8, 16
"""That part: one leaf in sixteen, within bounds."""

ALIKE = 0.5
"""The part's information, scaled to the whole's, may differ from it by so much in any direction."""


class Surface(Protocol):
    """The log-likelihood, its score (k, p) and information (k, p, p) at steps u (k, p) from the maximum.

    u is measured in standard errors: gamma = maximum + root u, with root'I root = 1.
    """

    def evaluate(self, u: Array, *, information: bool) -> Evaluation:
        """All values at u (k, p) in one pass."""


def whitening_root(information: Array) -> Array:
    """root (p, r) with root' information root = 1; r < p where the information is singular to working precision."""
    scale = np.sqrt(np.maximum(np.diag(information), np.finfo(float).tiny))
    scaled = information / np.outer(scale, scale)
    try:
        root, _ = dtrtri(cholesky(scaled))
    except (LinAlgError, ValueError):
        values, vectors = np.linalg.eigh(np.nan_to_num(scaled))
        kept = values > 1e-14 * values[-1]
        root = vectors[:, kept] / np.sqrt(values[kept])
    return np.asarray(root / scale[:, None])


class WholeSurface:
    """The log-likelihood itself."""

    def __init__(self, likelihood: Likelihood, centre: Array, root: Array) -> None:
        self.likelihood, self.centre, self.root = likelihood, centre, root

    def evaluate(self, u: Array, *, information: bool) -> Evaluation:
        found = self.likelihood.evaluate(self.centre + u @ self.root.T, information=information)
        curvature = None if found.information is None else self.root.T @ found.information @ self.root
        return Evaluation(found.log_likelihood, found.score @ self.root, curvature)


class ThinSurface:
    """The log-likelihood from an evenly spaced part of the rows.

    With l the log-likelihood of the part, l2 its quadratic approximation at the maximum and f the scale that brings
    the part's information to the size of the whole's,

        maximum - u'u / 2 + f (l(u) - l2(u)):

    the whole's quadratic approximation, with the higher derivatives of the part. At the distance of a limit these
    are a small correction, so a sample of the rows gives it to some digits.
    """

    def __init__(self, part: WholeSurface, maximum: float, there: Evaluation) -> None:
        assert there.information is not None
        self.part, self.maximum = part, maximum
        self.value, self.score, self.information = there.log_likelihood[0], there.score[0], there.information[0]
        self.scale = len(self.information) / float(np.trace(self.information))

    def evaluate(self, u: Array, *, information: bool) -> Evaluation:
        found = self.part.evaluate(u, information=information)
        pull = u @ self.information
        added = found.log_likelihood - self.value - u @ self.score + 0.5 * (u * pull).sum(axis=1)
        curvature = None
        if found.information is not None:
            curvature = np.eye(u.shape[1]) + self.scale * (found.information - self.information)
        return Evaluation(
            self.maximum - 0.5 * (u * u).sum(axis=1) + self.scale * added,
            self.scale * (found.score - self.score + pull) - u,
            curvature,
        )


def thin_surface(fit: Fit, root: Array) -> ThinSurface | None:
    """The surface from a part of the rows; None where there are few rows, or where the part is unlike the whole."""
    likelihood = fit.space.working
    if likelihood.rows < THIN_FROM or likelihood.curvature != "Hessian":
        return None
    leaves = likelihood.rows // (SHARE * LEAF_ROWS)
    part = WholeSurface(likelihood.thinned(min(max(leaves, FEWEST_LEAVES), MOST_LEAVES)), fit.working, root)
    there = part.evaluate(np.zeros((1, root.shape[1])), information=True)
    if there.information is None or not np.trace(there.information[0]) > 0.0:
        return None
    surface = ThinSurface(part, fit.log_likelihood, there)
    unlike = np.linalg.eigvalsh(surface.scale * surface.information) - 1.0
    return surface if np.abs(unlike).max() < ALIKE else None
