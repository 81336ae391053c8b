"""Exact fits without some of the covariate patterns."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import eigh

from oddsmodel.inference import maximise
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.likelihood.without_rows import WithoutRows
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import Leaf

Array = NDArray[np.float64]
Index = NDArray[np.int64]

LARGEST_LOG = math.log(1e6)
"""An odds ratio beyond a million either way, where that of the whole was not, is no estimate to be shown."""

CURVED = 1e-6
"""Least curvature of what remains, relative to the largest that all rows could have, from which a maximum may be
sought by the shorter way."""

STEPS = 4
FAST = 0.1
NEAR, SMALL = 1e-8, 1e-4
"""Each step of the shorter way must be a tenth of the one before or less; within four passes what is left must come
below 1e-8 of a standard error, after a step below 1e-4."""


@dataclass(frozen=True)
class Deletion:
    """A fit without `patterns` covariate patterns, which held `records` records.

    coefficients (p,): of the exact fit; None where the coefficients of interest have no usable estimate without them.
    A column of no interest that the rest of the records cannot tell from others has 0.
    """

    patterns: int
    records: int
    coefficients: Array | None


def without(model: FittedModel, left_out: Sequence[Index], targets: tuple[int, ...]) -> list[Deletion]:
    """The model fitted again without the rows at each of some sets of positions; `targets` are those of interest."""
    likelihoods = [WithoutRows(model.binomial, positions) for positions in left_out]
    deletions = []
    for likelihood, found in zip(likelihoods, _nearby(model, likelihoods), strict=True):
        coefficients = _refitted(model, likelihood, targets) if found is None else found
        if coefficients is not None and _beyond(model, coefficients, targets):
            usable = _beyond(model, model.fit.coefficients, targets)
            coefficients = coefficients if usable else None
        records = round(float(likelihood.few.rows_apart()[2].sum()))
        deletions.append(Deletion(likelihood.positions.size, records, coefficients))
    return deletions


class _Nearby:
    """A maximum without some rows that is sought from that with them, with the information that remains there."""

    def __init__(self, model: FittedModel, few: BinomialLikelihood) -> None:
        fit = model.fit
        self.few = few if fit.space.to_beta is None else few.transformed(fit.space.to_beta)
        start = self.few.evaluate(fit.working)
        assert start.information is not None
        self.information = fit.working_information - start.information[0]
        self.possible = float(eigh(self.information, fit.space.gram, eigvals_only=True)[0]) >= CURVED
        self.gamma = fit.working
        self.size = np.inf
        self.done = False
        if self.possible:
            self.step(np.zeros_like(fit.working), start.score[0])

    def step(self, whole: Array, few: Array) -> None:
        """Go on by the scores (r,) of all rows and of the few at gamma."""
        score = whole - few
        step = solve(self.information, score)
        size = math.sqrt(max(0.0, float(score @ step)))
        rate = size / self.size if self.size > 0.0 else 0.0
        self.gamma = self.gamma + step
        self.possible = rate <= FAST
        self.done = self.possible and math.isfinite(self.size) and size <= SMALL and rate * size <= NEAR
        self.size = size


def _nearby(model: FittedModel, likelihoods: Sequence[WithoutRows]) -> list[Array | None]:
    """The maxima, sought side by side in the same passes; None where one is too far away to be found so.

    With I the information of the rows that remain, at the fit of all, and s their score, beta <- beta + I^-1 s is
    repeated: the first step is the one-step estimate and needs no pass, every further one a pass for scores alone.
    Where the rows that remain are separated along v, v'Iv would be below about 4 s'I^-1 s max|x'v|² (see
    `maximise_all`), which at a step that small contradicts the least curvature that is asked for.
    """
    sought = [_Nearby(model, likelihood.few) for likelihood in likelihoods]
    for _ in range(STEPS):
        active = [one for one in sought if one.possible and not one.done]
        if not active:
            break
        whole = model.fit.space.working.evaluate(np.array([one.gamma for one in active]), information=False)
        for one, score in zip(active, whole.score, strict=True):
            one.step(score, one.few.evaluate(one.gamma, information=False).score[0])
    return [model.fit.space.beta(one.gamma) if one.done else None for one in sought]


def _refitted(model: FittedModel, likelihood: WithoutRows, targets: tuple[int, ...]) -> Array | None:
    """The maximum by the long way, which decides on rank and separation."""
    start = model.fit.coefficients
    fit = maximise(likelihood, start=start)
    kept = list(range(start.size))
    if fit.status == "aliased":
        tied = {relation.column for relation in fit.aliased}
        involved = tied | {column for relation in fit.aliased for column, _ in relation.weights}
        if involved & set(targets):
            return None
        kept = [column for column in kept if column not in tied]
        narrowed = BinomialLikelihood.over(likelihood.likelihood.passes.mapped(_Columns(tuple(kept))), len(kept))
        fit = maximise(WithoutRows(narrowed, likelihood.positions), start=start[kept])
    if fit.status != "converged":
        return None
    coefficients = np.zeros(start.size)
    coefficients[kept] = fit.coefficients
    return coefficients


@dataclass(frozen=True)
class _Columns:
    """Makes rows with some of the columns of the model matrix."""

    kept: tuple[int, ...]

    def __call__(self, rows: Leaf) -> Leaf:
        return {**rows, "X": rows["X"].take(self.kept, axis=1)}


def _beyond(model: FittedModel, coefficients: Array, targets: tuple[int, ...]) -> bool:
    """Whether an odds ratio that is shown lies beyond a million either way."""
    shown = [(i, model.design.columns[i].per) for i in targets if model.design.columns[i].shown]
    return any(abs(float(coefficients[i]) * per) > LARGEST_LOG for i, per in shown)
