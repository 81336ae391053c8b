"""The preference score: how the adjustment columns foretell a level of the exposure, groups taken as equally large."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.maximise import Fit, maximise
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.measures.counts import level_codes, model_levels
from oddsmodel.model.fitted import Array, FittedModel

EDGE = 0.05
"""A record lies outside the overlap where its preference is below this or above one minus this."""

BINS = 20


@dataclass(frozen=True, slots=True)
class Comparison:
    """Records at a level of the exposure and at its reference.

    outside (m,): which covariate patterns among them lie outside the overlap. records, outside_records: of both groups.
    alone: whether the adjustment columns leave only one of the groups for some records, so that the exposure's own
    model has no finite maximum. at_level, at_reference (20,): records by preference in twentieths.
    """

    level: str
    reference: str
    outside: NDArray[np.bool_]
    records: int
    outside_records: int
    alone: bool
    at_level: tuple[int, ...]
    at_reference: tuple[int, ...]

    @property
    def share(self) -> float:
        return self.outside_records / self.records


def fit_kept(X: Array, events: Array, trials: Array, start: Array) -> tuple[Fit, list[int]]:
    """The fit of events out of trials (m,) on X (m, p) without its aliased columns, and the columns kept.

    start (p,): coefficients to start from.
    """
    kept = [i for i in range(X.shape[1]) if X[:, i].any()]
    fit = maximise(BinomialLikelihood(X[:, kept], events, trials=trials), start=start[kept])
    if fit.status == "aliased":
        aliased = {relation.column for relation in fit.aliased}
        kept = [column for i, column in enumerate(kept) if i not in aliased]
        fit = maximise(BinomialLikelihood(X[:, kept], events, trials=trials), start=start[kept])
    return fit, kept


def adjustment_matrix(model: FittedModel, exposure: str) -> Array:
    """A column of ones and the model's columns that are not made from the exposure (m, 1 + q)."""
    kept = [i for i, c in enumerate(model.design.columns) if c.kind != "intercept" and exposure not in c.sources]
    X = model.patterns.X
    return np.hstack([np.ones((X.shape[0], 1)), X[:, kept]])


def compare(model: FittedModel, exposure: str) -> list[Comparison | None]:
    """Each level of a category exposure against its reference; None where the exposure's model did not converge.

    With S the fitted probability of the level among the records at it or at the reference, and P their share, the
    preference F has logit F = logit S - logit P (Walker et al. 2013, Comp Eff Res 3:11-20): the probability if both
    groups were equally large, so that a rare exposure does not look like a lack of overlap.
    """
    levels = model_levels(model, exposure)
    codes = level_codes(model.frame[exposure].iloc[model.patterns.first_row], levels)
    trials = model.patterns.trials
    present = np.bincount(codes[codes >= 0], weights=trials[codes >= 0], minlength=len(levels)) > 0
    named = next((c.reference for c in model.design.columns if c.sources == (exposure,) and c.reference), None)
    reference = levels.index(named) if named in levels else 0
    if not present[reference]:
        return []
    adjustment = adjustment_matrix(model, exposure)
    return [
        _against(adjustment, codes, trials, levels, level, reference)
        for level in range(len(levels))
        if level != reference and present[level]
    ]


def _against(
    adjustment: Array, codes: NDArray[np.int64], trials: Array, levels: tuple[str, ...], level: int, reference: int
) -> Comparison | None:
    among = np.flatnonzero(((codes == level) | (codes == reference)) & (trials > 0))
    X, records = adjustment[among], trials[among]
    exposed = np.where(codes[among] == level, records, 0.0)
    share = exposed.sum() / records.sum()
    start = np.zeros(X.shape[1])
    start[0] = np.log(share / (1.0 - share))
    fit, kept = fit_kept(X, exposed, records, start)
    if fit.status not in ("converged", "no finite maximum"):
        return None
    linear = X[:, kept] @ fit.coefficients - start[0]
    preference = 1.0 / (1.0 + np.exp(-np.clip(linear, -500.0, 500.0)))
    beyond = (preference < EDGE) | (preference > 1.0 - EDGE)
    outside = np.zeros(codes.size, dtype=bool)
    outside[among[beyond]] = True
    edges = np.linspace(0.0, 1.0, BINS + 1)
    at_level, at_reference = (
        tuple(np.rint(np.histogram(preference, edges, weights=weights)[0]).astype(int).tolist())
        for weights in (exposed, records - exposed)
    )
    return Comparison(
        level=levels[level],
        reference=levels[reference],
        outside=outside,
        records=round(float(records.sum())),
        outside_records=round(float(records[beyond].sum())),
        alone=fit.status == "no finite maximum",
        at_level=at_level,
        at_reference=at_reference,
    )


def variation_explained(model: FittedModel, exposure: str) -> float | None:
    """Share of a number exposure's variance that the adjustment columns explain by least squares.

    None where the exposure does not vary.
    """
    trials, index = model.patterns.trials, model.patterns.index
    x = model.frame[exposure].to_numpy(dtype=np.float64)
    counts = np.ones(x.size) if model.counts is None else model.counts
    x = x - (counts @ x) / counts.sum()
    total = float(counts @ x**2)
    if not total > 0.0:
        return None
    sums = np.bincount(index, weights=counts * x, minlength=trials.size)
    others = adjustment_matrix(model, exposure)[:, 1:]
    others = others - (trials @ others) / trials.sum()
    length = np.sqrt(trials @ others**2)
    others = others[:, length > 0] / length[length > 0]
    gram, cross = others.T @ (others * trials[:, None]), others.T @ sums
    explained = float(cross @ np.linalg.pinv(gram, rcond=1e-12, hermitian=True) @ cross)
    return min(1.0, explained / total)
