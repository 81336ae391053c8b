"""The contract between a likelihood and everything that maximises, profiles and tests."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, Protocol, runtime_checkable

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Evaluation:
    """Values at k coefficient vectors: log_likelihood (k,), score (k, p), information (k, p, p) or None.

    Constants free of the coefficients are left out. The log-likelihood may be minus infinity, never NaN.
    """

    log_likelihood: Array
    score: Array
    information: Array | None


@dataclass(frozen=True, slots=True)
class TraceDerivatives:
    """Derivatives in beta of tr(M I(beta)), M (p, p) held fixed, I the information, at k coefficient vectors.

    gradient (k, p): tr(M dI/dbeta_a). Where asked for, hessian (k, p, p): tr(M d2I/dbeta_a dbeta_b), and products
    (k, p, p): tr(M dI/dbeta_a M dI/dbeta_b). With M the inverse information these are the gradient of log|I| and the
    two parts of its Hessian, `hessian - products`. squares (k, p, p), where the information is a sum over rows of
    w x x': the sum of w'^2/w (x'Mx) x x', so that `squares - products` is the convex part of that Hessian. The last
    three guide steps and searches and may be approximate.
    """

    gradient: Array
    hessian: Array | None = None
    products: Array | None = None
    squares: Array | None = None


class Likelihood(Protocol):
    """A log-likelihood of p coefficients.

    curvature: whether `information` is minus the Hessian or its expectation.
    concave: whether the log-likelihood is concave, so that any stationary point is the maximum.
    """

    curvature: Literal["Hessian", "expected"]
    concave: bool

    @property
    def parameters(self) -> int:
        """The number p of coefficients."""

    @property
    def rows(self) -> int:
        """The number of rows a pass reads."""

    def evaluate(self, beta: Array, *, member: NDArray[np.int64] | None = None, information: bool = True) -> Evaluation:
        """All values at beta (k, p) in one pass; `member` (k,) names the data set of each row of beta."""

    def gram(self) -> Array:
        """X'NX with the trials N on its diagonal (p, p): four times the largest information there can be."""

    def transformed(self, basis: Array) -> Likelihood:
        """The likelihood of gamma (r,) with beta = basis gamma, basis (p, r) taken as exact."""

    def thinned(self, leaves: int) -> Likelihood:
        """The likelihood of an evenly spaced part of the rows, to start from."""

    def triangle(self) -> Array:
        """R of a QR factorisation of the rows' matrix, by columns (p, p), signs free."""

    def extended_score(self, beta: NDArray[np.longdouble]) -> NDArray[np.longdouble]:
        """The score at beta (p,) computed in the widest floating point the machine has."""

    def rows_apart(self) -> tuple[Array, Array, Array]:
        """X (n, p), events (n,) and trials (n,), for deciding whether the rows are separated."""


@runtime_checkable
class InformationLikelihood(Likelihood, Protocol):
    """A likelihood that can also say how its expected information changes with the coefficients."""

    def trace_derivatives(
        self, beta: Array, roots: Array, *, member: NDArray[np.int64] | None = None, second: bool = False
    ) -> TraceDerivatives:
        """Derivatives of tr(M I) at beta (k, p) with M = R R' for each R (p, r) of roots (k, p, r), in one pass."""

    def transformed(self, basis: Array) -> InformationLikelihood: ...

    def thinned(self, leaves: int) -> InformationLikelihood: ...
