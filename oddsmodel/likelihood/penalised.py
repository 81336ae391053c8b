"""A likelihood with Jeffreys' penalty: finite estimates where maximum likelihood has none."""

from __future__ import annotations

from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array, Evaluation, InformationLikelihood

LEAST_CURVATURE = 0.1
"""Curvature, relative to the information of the likelihood alone, that every direction is given for a step."""

VANISHED = 1e-250
"""Share of the gram matrix's diagonal at which the information counts as singular, before anything overflows."""


class JeffreysPenalisedLikelihood:
    """Penalised log-likelihood l(beta) + a log|I(beta)|, a = 1/2 (Firth 1993, Biometrika 80:27-38).

    Its score adds a tr(I^-1 dI/dbeta_j): for binomial rows with risk mu and hat value h = n mu (1 - mu) x'I^-1 x the
    term h (1/2 - mu) x a row (Firth 1993, section 3.1; Heinze & Schemper 2002, Statistics in Medicine 21:2409-2419,
    equation 2). Other powers a > 0 of the penalty are those of Kosmidis & Firth 2021 (Biometrika 108:71-82).

    The penalty is that of the whole model. Restricted to a subspace it keeps the information of all coefficients, so
    that a test, or a profile limit, does not depend on how the column left out is scaled. In other coordinates the
    value is the same, where the change of coordinates is of full rank.

    Conditions. Where the columns are linearly independent, the value of a binomial likelihood falls to minus infinity
    in every direction, so that a finite maximum exists whatever the outcomes (Kosmidis & Firth 2021). The value is not
    concave in general: with weights w_i = n_i mu_i (1 - mu_i), hat values h_ij = (w_i w_j)^1/2 x_i'I^-1 x_j and
    d_i = 1 - 2 mu_i, the Hessian of log|I| is

        - 2 sum h_ii mu_i (1 - mu_i) x_i x_i' + 1/2 sum_ij h_ij^2 (d_i x_i - d_j x_j)(d_i x_i - d_j x_j)',

    and its second sum, though mostly small, can win. Two maxima are seen with values far out, hardly ever with columns
    of 0 and 1. `maximise_penalised` and `profile_penalised` of the inference floor look for them.

    The information given is minus the exact Hessian, its eigenvalues relative to I raised to 0.1 where they are
    smaller, so that every step goes up and steps near a maximum are Newton's. By convention the estimate's covariance
    is not its inverse, but that of I (Heinze & Schemper 2002, section 2): see `maximise_penalised`.

    The value is minus infinity where the information is singular.
    """

    curvature: Literal["Hessian", "expected"] = "Hessian"
    concave = False

    def __init__(
        self, likelihood: InformationLikelihood, *, power: float = 0.5, scale: float = 0.0, within: Array | None = None
    ) -> None:
        """power: a, above zero. scale: a constant taken off log|I|, for coordinates that change its determinant.

        within (p, r): a basis of the subspace that this is restricted to, all p coefficients where None.
        """
        if not power > 0.0:
            raise ValueError("the power of the penalty must be above zero")
        self.likelihood, self.power, self.scale, self.within = likelihood, power, scale, within

    @property
    def parameters(self) -> int:
        return self.likelihood.parameters if self.within is None else int(self.within.shape[1])

    @property
    def rows(self) -> int:
        return self.likelihood.rows

    def evaluate(self, beta: Array, *, member: NDArray[np.int64] | None = None, information: bool = True) -> Evaluation:
        """Values at beta (k, p); two passes, one for the information and one for its derivatives."""
        points = self._points(beta)
        plain = self.likelihood.evaluate(points, member=member)
        if plain.information is None:
            raise TypeError("the penalty needs the information")
        roots, determinant = _inverse_roots(plain.information, VANISHED * np.diag(self.likelihood.gram()))
        determinant = np.where(np.isfinite(plain.log_likelihood), determinant, -np.inf)
        regular = np.isfinite(determinant)
        change = self.likelihood.trace_derivatives(points, roots, member=member, second=information)
        value = np.full(len(points), -np.inf)
        value[regular] = plain.log_likelihood[regular] + self.power * (determinant[regular] - self.scale)
        score = plain.score + self.power * change.gradient
        if self.within is not None:
            score = score @ self.within
        if not information:
            return Evaluation(value, score, None)
        curvature = plain.information
        if change.hessian is not None and change.products is not None:
            added = self.power * (change.hessian - change.products)
            curvature = np.where(regular[:, None, None], _raised(curvature, added, roots), curvature)
        return Evaluation(value, score, self._both(curvature))

    def _points(self, beta: Array) -> Array:
        """All coefficients (k, p) of beta (k, r) or (r,)."""
        points = np.atleast_2d(np.asarray(beta, dtype=np.float64))
        return points if self.within is None else points @ self.within.T

    def _both(self, matrix: Array) -> Array:
        """A matrix (..., p, p) of second derivatives in the coefficients of the subspace."""
        return matrix if self.within is None else self.within.T @ matrix @ self.within

    def parts_of_curvature(self, beta: Array) -> tuple[Array, Array | None, Array | None]:
        """At beta (p,): the expected information (p, p) of the likelihood alone, the Hessian of the penalty, and the
        convex part of that Hessian; None for what the likelihood does not give."""
        points = self._points(beta)
        information = self.likelihood.evaluate(points).information
        if information is None:
            raise TypeError("the penalty needs the information")
        roots, _ = _inverse_roots(information, VANISHED * np.diag(self.likelihood.gram()))
        change = self.likelihood.trace_derivatives(points, roots, second=True)
        parts = [
            None if part is None or change.products is None else self._both(self.power * (part[0] - change.products[0]))
            for part in (change.hessian, change.squares)
        ]
        return self._both(information[0]), parts[0], parts[1]

    def with_power(self, power: float) -> JeffreysPenalisedLikelihood:
        """The same rows with another power of the penalty."""
        return self._with(self.likelihood, power=power)

    def _with(self, likelihood: InformationLikelihood, **changes: Any) -> JeffreysPenalisedLikelihood:
        kept = {"power": self.power, "scale": self.scale, "within": self.within}
        return JeffreysPenalisedLikelihood(likelihood, **{**kept, **changes})

    def gram(self) -> Array:
        return self._both(self.likelihood.gram())

    def transformed(self, basis: Array) -> JeffreysPenalisedLikelihood:
        """The same value in other coordinates; in fewer, the penalty is still that of the whole model."""
        if self.within is not None or basis.shape[0] != basis.shape[1]:
            return self._with(self.likelihood, within=basis if self.within is None else self.within @ basis)
        scale = self.scale + 2.0 * float(np.linalg.slogdet(basis)[1])
        return self._with(self.likelihood.transformed(basis), scale=scale)

    def thinned(self, leaves: int) -> JeffreysPenalisedLikelihood:
        return self._with(self.likelihood.thinned(leaves))

    def triangle(self) -> Array:
        triangle = self.likelihood.triangle()
        return triangle if self.within is None else np.asarray(np.linalg.qr(triangle @ self.within, mode="r"))

    def rows_apart(self) -> tuple[Array, Array, Array]:
        """Rows that separate in no direction: the penalty takes the value down in every one, whatever the outcomes."""
        p = self.parameters
        return np.eye(p), np.full(p, 0.5), np.ones(p)

    def extended_score(self, beta: NDArray[np.longdouble]) -> NDArray[np.longdouble]:
        raise TypeError("a penalised fit has no certificate: its score is not computed in extended precision")


def _inverse_roots(information: Array, least: Array) -> tuple[Array, Array]:
    """R with I^-1 = R R' (k, p, p), and log|I| (k,), for each I of information (k, p, p).

    Zeros and minus infinity where I is singular, or a diagonal element not above `least` (p,).
    """
    k = len(information)
    roots, determinant = np.zeros_like(information), np.full(k, -np.inf)
    diagonal = np.diagonal(information, axis1=1, axis2=2)
    some = np.flatnonzero((np.isfinite(diagonal) & (diagonal > least)).all(axis=1))
    size = np.sqrt(diagonal[some])
    scaled = information[some] / (size[:, :, None] * size[:, None, :])
    try:
        factors = np.linalg.cholesky(scaled)
    except np.linalg.LinAlgError:
        if k == 1:
            return roots, determinant
        each = [_inverse_roots(information[one : one + 1], least) for one in range(k)]
        return np.concatenate([one for one, _ in each]), np.concatenate([one for _, one in each])
    roots[some] = np.linalg.inv(factors).transpose(0, 2, 1) / size[:, :, None]
    determinant[some] = 2.0 * (np.log(np.diagonal(factors, axis1=1, axis2=2)) + np.log(size)).sum(axis=1)
    return roots, determinant


def _raised(information: Array, added: Array, roots: Array) -> Array:
    """information - added (k, p, p), its eigenvalues relative to the information at least `LEAST_CURVATURE`."""
    p = information.shape[1]
    values, vectors = np.linalg.eigh(np.eye(p) - roots.transpose(0, 2, 1) @ added @ roots)
    lacking = np.maximum(LEAST_CURVATURE - values, 0.0)
    curvature = information - added
    for k in np.flatnonzero(lacking.any(axis=1)).tolist():
        # with I^-1 = R R', whitened vectors V come back as I R V
        back = information[k] @ (roots[k] @ vectors[k])
        curvature[k] += (back * lacking[k]) @ back.T
    return curvature
