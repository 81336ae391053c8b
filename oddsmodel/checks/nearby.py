"""Maxima over spaces near a point whose information is known: a pass or two that need the score alone."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.base import Array, Evaluation, Likelihood

SETTLED = 1e-10
"""What a step may leave of its squared length, judged by what the last one left, times that length."""

MOST_PASSES = 12
SLOW = 0.25
"""A squared length of step that falls to no less than this part says that the information does not serve."""

PART_LEAVES = 8
PART_FROM = 65_536
"""From so many rows on a part of them tells how the information changes; fewer rows are soon maximised over whole."""

PART_STEPS = 4
WELL_CONDITIONED = 1e-7


@dataclass(frozen=True, eq=False)
class Known:
    """What is known of a likelihood at one point (p,): its score (p,) and information (p, p)."""

    point: Array
    score: Array
    information: Array


@dataclass(frozen=True, eq=False)
class Nearby:
    """The maximum over a space: point (p,), log_likelihood, and the information (p, p) there, of which the change from
    the known point is that of a part of the rows. distance: to that point, squared, in standard errors."""

    point: Array
    log_likelihood: float
    information: Array
    distance: float


def maxima_near(likelihood: Likelihood, known: Known, spaces: Sequence[Array]) -> list[Nearby | None]:
    """The maximum over each of several spaces {B h}, B (p, r) of full column rank, that are all near a known point.

    With s_0 and I_0 the score and the information at that point b_0, and t, T, t_0, T_0 those of an evenly spaced part
    of the rows, c times fewer, at b and at b_0, the score and the information at b = B h are close to

        s_0 - I_0 (b - b_0) + c [t - t_0 + T_0 (b - b_0)],    J = I_0 + c (T - T_0),

    the quadratic approximation with what the part says of the rest of the change. Newton steps by these begin the
    search; then passes over all rows give the score s itself for steps (B'JB)^-1 B's, which settle at once since J is
    out only by what the part tells wrongly of a small change. Half the last squared length of step (B's)'(B'JB)^-1 B's
    is added to the log-likelihood, which makes it good to the third order of that step.

    None where the steps do not settle soon: the problem is then one for `maximise_all`. Spaces must not be empty.
    """
    part = _Part(likelihood, known)
    searches = [_Search(known, space) for space in spaces]
    part.begin(searches)
    active = searches
    for _ in range(MOST_PASSES):
        points = np.array([one.point for one in active])
        found = likelihood.evaluate(points, information=False)
        for k, (one, information) in enumerate(zip(active, part.informations(points), strict=True)):
            one.take(float(found.log_likelihood[k]), found.score[k], information)
        active = [one for one in active if not (one.settled or one.lost)]
        if not active:
            break
    return [one.nearby() if one.settled else None for one in searches]


def well_conditioned(information: Array) -> bool:
    """Whether an information matrix (p, p) can be worked with in the coefficients as they are."""
    size = np.sqrt(np.maximum(np.diag(information), 0.0))
    if not (np.isfinite(size).all() and (size > 0.0).all()):
        return False
    return bool(np.linalg.eigvalsh(information / np.outer(size, size))[0] > WELL_CONDITIONED)


class _Part:
    """The part of the rows that tells of changes from the known point."""

    def __init__(self, likelihood: Likelihood, known: Known) -> None:
        self.known = known
        self.part = likelihood.thinned(PART_LEAVES)
        self.times = likelihood.rows / self.part.rows
        scores, informations = _both(self.part.evaluate(known.point[None, :]))
        self.score, self.information = scores[0], informations[0]

    def informations(self, points: Array) -> Array:
        """The information (k, p, p) at points (k, p), nearly."""
        return self._changed(_both(self.part.evaluate(points))[1])

    def _changed(self, informations: Array) -> Array:
        return np.asarray(self.known.information + self.times * (informations - self.information))

    def begin(self, searches: Sequence[_Search]) -> None:
        """Bring searches to where the maximum is by what this part tells."""
        active = list(searches)
        for _ in range(PART_STEPS):
            points = np.array([one.point for one in active])
            scores, informations = _both(self.part.evaluate(points))
            way = points - self.known.point
            scores = (
                self.known.score
                - way @ self.known.information
                + self.times * (scores - self.score + way @ self.information)
            )
            changed = self._changed(informations)
            active = [one for k, one in enumerate(active) if one.approach(scores[k], changed[k])]
            if not active:
                return


def _both(found: Evaluation) -> tuple[Array, Array]:
    if found.information is None:
        raise TypeError("a likelihood with information is needed")
    return found.score, found.information


class _Search:
    """One space: where the search stands, and whether it is over."""

    def __init__(self, known: Known, space: Array) -> None:
        self.known = known
        self.space = np.linalg.qr(space)[0]
        pull = self.space.T @ (known.information @ known.point + known.score)
        self.h = solve(self._within(known.information), pull)
        self.begun = self.h
        self.information = known.information
        self.value = self.length = np.inf
        self.last: tuple[Array, Array] | None = None
        self.settled = self.lost = False

    @property
    def point(self) -> Array:
        return np.asarray(self.space @ self.h)

    def _within(self, matrix: Array) -> Array:
        return np.asarray(self.space.T @ matrix @ self.space)

    def _distance(self) -> float:
        way = self.point - self.known.point
        return float(way @ self.known.information @ way)

    def approach(self, score: Array, information: Array) -> bool:
        """Step by what a part of the rows tells; whether another such step is worth while."""
        step, length = self._step(score, information)
        if not length <= self.length:
            self.h = self.begun
            return False
        self.h, self.length = self.h + step, length
        return length > SETTLED

    def take(self, value: float, score: Array, information: Array) -> None:
        """Step on by the score at the present point."""
        before = self.length if np.isfinite(self.value) else self._distance()
        step, length = self._step(score, information)
        left = np.sqrt(length / before) if length < before else 1.0
        self.settled = length * left <= SETTLED
        self.lost = not (self.settled or length <= SLOW * before)
        self.last = (self.h, self.space.T @ score)
        self.h = self.h + step
        self.value, self.length, self.information = value + 0.5 * length, length, information

    def _step(self, score: Array, information: Array) -> tuple[Array, float]:
        """The step and its squared length in standard errors, infinite where there is none."""
        within, pull = self._within(information), self.space.T @ score
        if not (np.isfinite(pull).all() and well_conditioned(within)):
            return np.zeros_like(self.h), np.inf
        if self.last is not None:
            within = _along(within, self.h - self.last[0], self.last[1] - pull)
        step = solve(within, pull)
        return step, float(pull @ step)

    def nearby(self) -> Nearby:
        return Nearby(self.point, self.value, self.information, self._distance())


def _along(within: Array, way: Array, fall: Array) -> Array:
    """Information (r, r) that explains by how much the score fell along the last way (Broyden 1970, J Inst Maths
    Applics 6:76-90, and others of that year)."""
    through = within @ way
    told, held = float(fall @ way), float(through @ way)
    if not (told > 0.0 and held > 0.0):
        return within
    return np.asarray(within - np.outer(through, through) / held + np.outer(fall, fall) / told)
