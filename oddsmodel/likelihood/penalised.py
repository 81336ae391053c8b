"""The binomial likelihood with Jeffreys' penalty: finite estimates where maximum likelihood has none."""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array, Evaluation
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.likelihood.logistic import logistic
from oddsmodel.passes import Leaf


class JeffreysPenalisedLikelihood:
    """Penalised log-likelihood l(beta) + log|I(beta)| / 2 of a binomial likelihood (Firth 1993, Biometrika 80:27-38).

    Its score adds, for each row with risk mu and hat value h = n mu (1 - mu) x'I^-1 x, the term h (1/2 - mu) x
    (Firth 1993, section 3.1; Heinze & Schemper 2002, equation 2). The information given is that of the likelihood
    without the penalty, so steps are those of Fisher scoring. Restricted to a subspace, the penalty keeps the
    information of all coefficients, so that a test does not depend on the scaling of the column left out.

    The penalty is the same in any coordinates but for a constant, which is left out. It is minus infinity where the
    information is singular.
    """

    curvature: Literal["Hessian", "expected"] = "expected"
    concave = False

    def __init__(self, likelihood: BinomialLikelihood) -> None:
        self.likelihood = likelihood

    @property
    def parameters(self) -> int:
        return self.likelihood.parameters

    @property
    def rows(self) -> int:
        return self.likelihood.rows

    def evaluate(self, beta: Array, *, member: NDArray[np.int64] | None = None, information: bool = True) -> Evaluation:
        """Values at beta (k, p); two passes, one for the information and one for the penalty's score."""
        points = np.atleast_2d(np.asarray(beta, dtype=np.float64))
        plain = self.likelihood.evaluate(points, member=member)
        if plain.information is None:
            raise TypeError("the penalty needs the information")
        sign, log_determinant = np.linalg.slogdet(plain.information)
        regular = (sign > 0) & np.isfinite(plain.log_likelihood)
        inverse = np.zeros_like(plain.information)
        inverse[regular] = np.linalg.inv(plain.information[regular])
        added = self.likelihood.passes.reduce([_PenaltyScore(inverse)], points)[0][0].T
        with np.errstate(invalid="ignore"):
            value = np.where(regular, plain.log_likelihood + 0.5 * log_determinant, -np.inf)
        return Evaluation(value, plain.score + added, plain.information if information else None)

    def gram(self) -> Array:
        return self.likelihood.gram()

    def transformed(self, basis: Array) -> JeffreysPenalisedLikelihood:
        return JeffreysPenalisedLikelihood(self.likelihood.transformed(basis))

    def thinned(self, leaves: int) -> JeffreysPenalisedLikelihood:
        return JeffreysPenalisedLikelihood(self.likelihood.thinned(leaves))

    def triangle(self) -> Array:
        return self.likelihood.triangle()

    def rows_apart(self) -> tuple[Array, Array, Array]:
        return self.likelihood.rows_apart()

    def extended_score(self, beta: NDArray[np.longdouble]) -> NDArray[np.longdouble]:
        raise TypeError("a penalised fit has no certificate: its score is not computed in extended precision")


class _PenaltyScore:
    def __init__(self, inverse: Array) -> None:
        self.inverse = inverse

    def leaf(self, rows: Leaf, beta: Array) -> tuple[Array]:
        X = rows["X"]
        linear = X @ beta.T
        if "offset" in rows:
            linear += rows["offset"][:, None]
        small, whole, risk = logistic(linear)
        weight = small / (whole * whole)
        if "trials" in rows:
            weight *= rows["trials"][:, None]
        reach = np.stack([np.einsum("ij,ij->i", X @ inverse, X) for inverse in self.inverse], axis=1)
        return (X.T @ (weight * reach * (0.5 - risk)),)
