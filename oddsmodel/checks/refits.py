"""A model fitted again to data sets that are its own records counted otherwise."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from typing import Any, Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy.linalg import LinAlgError, eigh

from oddsmodel.checks.resamples import Counts, Population, population_of_records, population_of_rows
from oddsmodel.design.arithmetic import Expression, Function, Operation, Total
from oddsmodel.design.encoder import design_of
from oddsmodel.design.factors import BasisSpline, Computed, CubicSpline, Factor, RestrictedCubicSpline
from oddsmodel.design.formula import VettedFormula, vet_formula
from oddsmodel.design.training import FrameTraining
from oddsmodel.errors import InputFault
from oddsmodel.inference.conditioning import coordinates
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.likelihood.resampled import ResampledLikelihood
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import MemoryPasses
from oddsmodel.passes.base import TASK_ROWS
from oddsmodel.passes.local import in_order

Array = NDArray[np.float64]

DECREMENT, FLAT = 1e-10, 1e-9
"""Newton decrement squared at which a step is the last, and curvature relative to the largest there could be below
which a direction is flat: a separated data set has a flat one at such a decrement (see `maximise_all`)."""

DEPENDENT = 1e-10
"""Smallest eigenvalue of the scaled gram matrix from which the columns of a data set are told apart."""

MOST_STEPS, MOST_HALVINGS = 40, 20


class Refits(Protocol):
    """Fits the model to data sets with events and trials (k, m) at its rows."""

    def linear(self, events: Counts, trials: Counts) -> list[Array | None]:
        """The linear predictor (m,) of all rows by each fit; None where the data set has no finite, unique maximum."""


def refits_of(model: FittedModel) -> tuple[Population, Refits]:
    """What is drawn from, and how the model is fitted again: with its columns as they are, or made anew where they
    learn from the records."""
    formula = learning_formula(model)
    if formula is None:
        return population_of_rows(model), SameColumns(model)
    population, frame = population_of_records(model, formula.columns)
    return population, ColumnsAnew(formula, frame, model)


def maxima(likelihood: ResampledLikelihood, start: Array) -> list[Array | None]:
    """The maximum (p,) of every member by Newton's method from `start` (p,), all members in the same passes.

    A step is halved while the log-likelihood falls. None where the columns depend on one another among the records of a
    member, where its records are separated, and where the search does not settle.
    """
    members = likelihood.members
    grams = likelihood.grams()
    beta = np.tile(np.asarray(start, dtype=np.float64), (members, 1))
    step = np.zeros_like(beta)
    value, last, halved = np.full(members, -np.inf), np.zeros(members, dtype=bool), np.zeros(members, dtype=int)
    found: list[Array | None] = [None] * members
    active = np.array([one for one in range(members) if _told_apart(grams[one])], dtype=np.int64)
    for _ in range(MOST_STEPS):
        if not active.size:
            break
        there = likelihood.evaluate(beta[active] + step[active], member=active)
        assert there.information is not None
        for k, one in enumerate(active.tolist()):
            slack = 1e-12 * abs(value[one]) if np.isfinite(value[one]) else 0.0
            if not there.log_likelihood[k] >= value[one] - slack:
                step[one] /= 2.0
                halved[one] += 1
                last[one] = halved[one] > MOST_HALVINGS
                continue
            beta[one] += step[one]
            value[one], halved[one] = there.log_likelihood[k], 0
            step[one] = solve(there.information[k], there.score[k])
            if there.score[k] @ step[one] <= DECREMENT:
                last[one] = True
                if not _flat(there.information[k], grams[one]):
                    found[one] = beta[one] + step[one]
        active = active[~last[active]]
    return found


def _told_apart(gram: Array) -> bool:
    length = np.sqrt(np.diag(gram))
    return bool((length > 0.0).all()) and float(np.linalg.eigvalsh(gram / np.outer(length, length))[0]) > DEPENDENT


def _flat(information: Array, gram: Array) -> bool:
    """Whether a direction has no curvature to speak of."""
    try:
        return float(eigh(information, gram, eigvals_only=True, subset_by_index=(0, 0))[0]) < FLAT
    except LinAlgError:
        return True


class SameColumns:
    """Fits with the columns of the model matrix as they are, many at once."""

    def __init__(self, model: FittedModel) -> None:
        working = model.fit.space.working
        assert isinstance(working, BinomialLikelihood)
        self.passes, self.parameters, self.start = working.passes, working.parameters, model.fit.working

    def linear(self, events: Counts, trials: Counts) -> list[Array | None]:
        likelihood = ResampledLikelihood(self.passes, self.parameters, events, trials)
        found = maxima(likelihood, self.start)
        known = [k for k, one in enumerate(found) if one is not None]
        answers: list[Array | None] = [None] * len(found)
        if known:
            rows = likelihood.linear(np.array([found[k] for k in known]))
            for place, k in enumerate(known):
                answers[k] = rows[place]
        return answers


class ColumnsAnew:
    """Fits whose knots, means and deviations are those of each data set."""

    def __init__(self, formula: VettedFormula, frame: pd.DataFrame, model: FittedModel) -> None:
        """frame: the record columns of m rows."""
        self.formula, self.frame = formula, frame
        self.columns, self.exposures = model.columns, model.exposures

    def linear(self, events: Counts, trials: Counts) -> list[Array | None]:
        def fitted(one: int) -> Array | None:
            return self._fitted(events[one].astype(np.float64), trials[one].astype(np.float64))

        return list(across(fitted, range(len(trials)), len(self.frame)))

    def _fitted(self, events: Array, trials: Array) -> Array | None:
        try:
            training = FrameTraining(self.frame, self.formula.where, trials)
            X = design_of(self.formula, training, self.columns, self.exposures).encode(self.frame)
        except InputFault:
            return None
        held = trials > 0.0
        arrays = {"X": X[held], "events": events[held], "trials": trials[held]}
        space = coordinates(BinomialLikelihood.over(MemoryPasses(arrays), X.shape[1]))
        if space.aliased:
            return None
        assert isinstance(space.working, BinomialLikelihood)
        counts = (arrays[name].astype(np.int64)[None] for name in ("events", "trials"))
        found = maxima(ResampledLikelihood(space.working.passes, X.shape[1], *counts), np.zeros(X.shape[1]))[0]
        return None if found is None else np.asarray(X @ space.beta(found))


def across(task: Callable[[int], Any], items: Sequence[int], rows: int) -> Iterator[Any]:
    """The results of a task for every item, in order: in threads, unless the rows are so many that its passes are."""
    return in_order(task, items) if rows <= TASK_ROWS else map(task, items)


def learning_formula(model: FittedModel) -> VettedFormula | None:
    """The formula of a model, where a column of its matrix depends on all records: by knots, means or deviations."""
    terms = [term.name for term in model.design.terms if term.factors]
    if not any("(" in name for name in terms):
        return None
    intercept = any(column.kind == "intercept" for column in model.design.columns)
    text = " + ".join(terms) + ("" if intercept else " - 1")
    formula = vet_formula(text, columns=tuple(model.columns), outcome="", where=model.design.where)
    return formula if any(_learns(factor) for factor in formula.factors) else None


def _learns(factor: Factor) -> bool:
    if isinstance(factor, BasisSpline | CubicSpline):
        return True
    if isinstance(factor, RestrictedCubicSpline):
        return isinstance(factor.knots, int) or _remembers(factor.expression)
    return isinstance(factor, Computed) and _remembers(factor.expression)


def _remembers(expression: Expression) -> bool:
    if isinstance(expression, Function):
        return expression.name in ("center", "standardize") or _remembers(expression.argument)
    if isinstance(expression, Operation):
        return _remembers(expression.left) or _remembers(expression.right)
    return isinstance(expression, Total) and any(_remembers(item) for _, item in expression.items)
