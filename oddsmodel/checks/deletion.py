"""Exact fits without some of the covariate patterns."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model.fitted import FittedModel

Array = NDArray[np.float64]


LARGEST_LOG = math.log(1e6)
"""An odds ratio beyond a million either way, where that of the whole was not, is no estimate to be shown."""


@dataclass(frozen=True)
class Deletion:
    """A fit without `patterns` covariate patterns, which held `records` records.

    coefficients (p,): of the exact fit; None where the coefficients of interest have no usable estimate without them.
    A column of no interest that the rest of the records cannot tell from others has 0.
    """

    patterns: int
    records: int
    coefficients: Array | None


def without(model: FittedModel, left_out: NDArray[np.int64], targets: tuple[int, ...]) -> Deletion:
    """The model fitted again without the patterns `left_out`; `targets` are the coefficients of interest."""
    keep = np.ones(model.patterns.trials.size, dtype=bool)
    keep[left_out] = False
    records = round(float(model.patterns.trials[left_out].sum()))
    X, events, trials = model.patterns.X[keep], model.patterns.events[keep], model.patterns.trials[keep]
    start = model.fit.coefficients
    columns = np.arange(X.shape[1])
    if not keep.any():
        return Deletion(left_out.size, records, None)
    fit = maximise(BinomialLikelihood(X, events, trials=trials), start=start)
    if fit.status == "aliased":
        tied = {relation.column for relation in fit.aliased}
        involved = tied | {column for relation in fit.aliased for column, _ in relation.weights}
        if involved & set(targets):
            return Deletion(left_out.size, records, None)
        columns = np.array([column for column in columns if column not in tied], dtype=int)
        fit = maximise(BinomialLikelihood(X[:, columns], events, trials=trials), start=start[columns])
    if fit.status != "converged":
        return Deletion(left_out.size, records, None)
    coefficients = np.zeros(X.shape[1])
    coefficients[columns] = fit.coefficients
    usable = not _beyond(model, coefficients, targets) or _beyond(model, model.fit.coefficients, targets)
    return Deletion(left_out.size, records, coefficients if usable else None)


def _beyond(model: FittedModel, coefficients: Array, targets: tuple[int, ...]) -> bool:
    """Whether an odds ratio that is shown lies beyond a million either way."""
    shown = [(i, model.design.columns[i].per) for i in targets if model.design.columns[i].shown]
    return any(abs(float(coefficients[i]) * per) > LARGEST_LOG for i, per in shown)
