"""Maximum likelihood by Newton's method with step halving, many problems side by side."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np

from oddsmodel.inference.conditioning import Coordinates, Relation, coordinates
from oddsmodel.inference.separation import Separation, separating_direction, separation_of
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.base import Array, Likelihood

Status = Literal["converged", "no finite maximum", "aliased", "not converged"]

DECREMENT = 1e-16
"""Newton decrement squared at which the next full step is the last."""

MOST_STEPS = 80
MOST_HALVINGS = 40

FLAT = 1e-9
"""Curvature, relative to the largest the rows could have, below which a direction is flat: see `_flat`."""

THIN_LEAVES = 8
THIN_FROM = 65_536


@dataclass(frozen=True)
class Problem:
    """Maximise over beta = origin + basis h, with basis (p, r) of full column rank; None means all of beta."""

    basis: Array | None = None
    origin: Array | None = None
    start: Array | None = None


@dataclass(frozen=True)
class Fit:
    """The maximum over a linear space of coefficients.

    coefficients (p,), covariance (p, p) (singular where the space is smaller than p), information (p, p) at the
    maximum, log_likelihood without constants. dimension: of the space. decrement: the squared Newton decrement
    at the last evaluation. flat (p,): a direction in which the log-likelihood never stops rising, where there is
    one; separation: the verdict on the rows, where all coefficients were free and it was asked for. Where status is
    "no finite maximum", the coefficients are not an estimate, and log_likelihood is its supremum to within rounding
    where the decrement is at most 1e-16, else what was reached.
    """

    status: Status
    likelihood: Likelihood
    coefficients: Array
    log_likelihood: float
    information: Array
    covariance: Array
    dimension: int
    decrement: float
    steps: int
    space: Coordinates
    working: Array
    working_information: Array
    aliased: tuple[Relation, ...] = ()
    flat: Array | None = None
    separation: Separation | None = None

    @cached_property
    def standard_errors(self) -> Array:
        """Standard errors (p,) from the inverse information."""
        return np.sqrt(np.maximum(np.diag(self.covariance), 0.0))


def maximise(
    likelihood: Likelihood,
    *,
    basis: Array | None = None,
    origin: Array | None = None,
    start: Array | None = None,
) -> Fit:
    """The maximum of a likelihood over beta = origin + basis h (all of beta where both are None)."""
    return maximise_all(likelihood, [Problem(basis, origin, start)])[0]


def maximise_all(likelihood: Likelihood, problems: Sequence[Problem], *, near: Fit | None = None) -> list[Fit]:
    """Several maxima of one likelihood side by side, in shared passes.

    Newton's method: h <- h + (B'IB)^-1 B's with score s and information I at beta, B an orthonormal basis of the
    space in working coordinates. The step is halved while the log-likelihood falls. It stops

    1. when the squared Newton decrement s'B(B'IB)^-1 B's is at most 1e-16 and the step then taken is full
       ("converged", or "no finite maximum" where a direction is flat: see below), or
    2. when the step cannot be halved further or 80 steps are done ("not converged").

    A direction v is flat when v'Iv < 1e-9 v'X'NXv. If the records are separated along v, every record moved by
    v has x'v of the sign of its outcome, so v'Iv <= max|x'v| s'v; at a decrement of 1e-16 the curvature is then
    below 1e-16 of v'X'NXv: no separated data set converges without a flat direction. A flat direction alone is
    only a symptom, and so is a search that does not settle; the linear programs of `separation` then decide, so that
    clean records pay nothing.

    near: the fit of a larger space, whose quadratic approximation gives the starting points.
    Large data start from the maximum over an evenly spaced part of the rows.
    """
    space = coordinates(likelihood)
    if space.aliased:
        return [_aliased(likelihood, space) for _ in problems]
    runs = [_Run(likelihood, space, problem, near) for problem in problems]
    starting = [run for run in runs if near is None and run.problem.start is None]
    if starting and likelihood.rows >= THIN_FROM:
        thin = space.working.thinned(THIN_LEAVES)
        trial = [_Run(likelihood, space, run.problem, None, trial=True) for run in starting]
        _newton(thin, trial)
        for run, tried in zip(starting, trial, strict=True):
            if tried.done and tried.flat is None:
                run.place(tried.h, tried.first_value * likelihood.rows / thin.rows)
    _newton(space.working, runs)
    return [run.fit(likelihood) for run in runs]


class _Run:
    """One maximisation in progress, in the coordinates of its own space."""

    def __init__(
        self, likelihood: Likelihood, space: Coordinates, problem: Problem, near: Fit | None, *, trial: bool = False
    ) -> None:
        p = space.gram.shape[0]
        self.likelihood, self.trial = likelihood, trial
        self.space, self.problem = space, problem
        self.origin = space.gamma(np.zeros(p) if problem.origin is None else np.asarray(problem.origin, float))
        if problem.basis is None:
            self.basis: Array | None = None
            self.gram = space.gram
        else:
            moved = space.gamma(np.asarray(problem.basis, dtype=np.float64).T).T
            self.basis = np.linalg.qr(moved)[0] if moved.shape[1] else moved
            self.gram = self.basis.T @ space.gram @ self.basis
        r = self.gram.shape[0]
        self.h: Array = np.zeros(r)
        if problem.start is not None:
            self.h = self._reduced(space.gamma(np.asarray(problem.start, float)) - self.origin)
        elif near is not None:
            pull = near.working_information @ (near.working - self.origin)
            reduced = near.working_information if self.basis is None else self._both(near.working_information)
            self.h = np.asarray(np.linalg.lstsq(reduced, self._reduced(pull), rcond=None)[0], dtype=np.float64)
        self.step: Array = np.zeros(r)
        self.value = self.first_value = self.worth = -np.inf
        self.decrement = np.inf
        self.information = np.zeros((p, p))
        self.steps = 0
        self.halvings = 0
        self.done = False
        self.failed = False
        self.flat: Array | None = None
        self.separation: Separation | None = None

    def _reduced(self, vector: Array) -> Array:
        return vector if self.basis is None else self.basis.T @ vector

    def _both(self, matrix: Array) -> Array:
        return matrix if self.basis is None else self.basis.T @ matrix @ self.basis

    def place(self, h: Array, worth: float) -> None:
        """Start from h, unless its log-likelihood turns out below `worth`, about that of starting from zero."""
        self.h, self.worth = h.copy(), worth

    def gamma(self, h: Array) -> Array:
        return self.origin + (h if self.basis is None else self.basis @ h)

    @property
    def candidate(self) -> Array:
        return self.gamma(self.h + self.step)

    def take(self, value: float, score: Array, information: Array) -> None:
        """Accept or halve the step that led to the candidate; then decide the next one."""
        if not np.isfinite(self.first_value):
            self.first_value = value
            if value < self.worth:
                # rows in an order that the evenly spaced part does not represent
                self.h, self.worth, self.first_value = np.zeros_like(self.h), -np.inf, -np.inf
                return
        slack = 1e-12 * max(1.0, abs(self.value)) if np.isfinite(self.value) else 0.0
        if not value >= self.value - slack:
            self.step = self.step / 2.0
            self.halvings += 1
            if self.halvings > MOST_HALVINGS:
                self._give_up()
            return
        self.h = self.h + self.step
        self.value, self.information, self.halvings = value, information, 0
        self.steps += 1
        reduced_score, reduced = self._reduced(score), self._both(information)
        step = solve(reduced, reduced_score)
        self.decrement = float(reduced_score @ step)
        if self.decrement <= DECREMENT:
            flat = _flat(reduced, self.gram)
            self.flat = flat if flat is None or self.trial else self._separated_along()
            if self.flat is None:
                self.h = self.h + step
            self.done = True
            return
        self.step = step
        if self.steps >= MOST_STEPS:
            self._give_up()

    def _give_up(self) -> None:
        """End a search that does not settle, which separated records can be the reason of."""
        if not self.trial and self.likelihood.concave:
            self.flat = self._separated_along()
        self.done = self.flat is not None
        self.failed = not self.done

    def _separated_along(self) -> Array | None:
        """A direction of separation within this space, in its own coordinates; proved where the space is the whole."""
        if self.basis is not None:
            return separating_direction(self.space.working.transformed(self.basis))
        self.separation = separation_of(self.likelihood)
        return self.space.gamma(self.separation.direction) if self.separation.separated else None

    def fit(self, likelihood: Likelihood) -> Fit:
        gamma = self.gamma(self.h)
        reduced = self._both(self.information)
        p = self.space.gram.shape[0]
        inverse = solve(reduced, np.eye(reduced.shape[0]))
        covariance = inverse if self.basis is None else self.basis @ inverse @ self.basis.T
        information = self.information
        to_beta, from_beta = self.space.to_beta, self.space.from_beta
        if to_beta is not None and from_beta is not None:
            covariance = to_beta @ covariance @ to_beta.T
            information = from_beta.T @ information @ from_beta
        flat = None
        if self.flat is not None:
            direction = self.flat if self.basis is None else self.basis @ self.flat
            flat = self.space.beta(direction)
        status: Status = "not converged"
        if self.done:
            status = "converged" if flat is None else "no finite maximum"
        return Fit(
            status=status,
            likelihood=likelihood,
            coefficients=self.space.beta(gamma),
            log_likelihood=self.value + (0.5 * self.decrement if self.done else 0.0),
            information=information,
            covariance=(covariance + covariance.T) / 2.0,
            dimension=reduced.shape[0] if p else 0,
            decrement=self.decrement,
            steps=self.steps,
            space=self.space,
            working=gamma,
            working_information=self.information,
            flat=flat,
            separation=self.separation,
        )


def _newton(likelihood: Likelihood, runs: Sequence[_Run]) -> None:
    active = [run for run in runs if not run.done]
    while active:
        evaluation = likelihood.evaluate(np.array([run.candidate for run in active]))
        if evaluation.information is None:
            raise TypeError("Newton's method needs the information")
        for k, run in enumerate(active):
            run.take(float(evaluation.log_likelihood[k]), evaluation.score[k], evaluation.information[k])
        active = [run for run in active if not (run.done or run.failed)]


def _flat(information: Array, gram: Array) -> Array | None:
    """The direction of least curvature relative to the gram matrix, where that is below `FLAT`."""
    if information.shape[0] == 0:
        return None
    scale = np.sqrt(np.diag(gram))
    values, vectors = np.linalg.eigh(gram / np.outer(scale, scale))
    root = (vectors / np.sqrt(np.maximum(values, np.finfo(float).tiny))).T / scale
    least, directions = np.linalg.eigh(root @ information @ root.T)
    if least[0] >= FLAT:
        return None
    direction = root.T @ directions[:, 0]
    return np.asarray(direction / np.abs(direction).max())


def _aliased(likelihood: Likelihood, space: Coordinates) -> Fit:
    p = space.gram.shape[0]
    nothing = np.zeros((p, p))
    return Fit(
        status="aliased",
        likelihood=likelihood,
        coefficients=np.zeros(p),
        log_likelihood=-np.inf,
        information=nothing,
        covariance=nothing,
        dimension=p - len(space.aliased),
        decrement=np.inf,
        steps=0,
        space=space,
        working=np.zeros(p),
        working_information=nothing,
        aliased=space.aliased,
    )
