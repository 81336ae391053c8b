"""The preference score: how the adjustment columns foretell a level of the exposure, groups taken as equally large."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.nearby import PART_FROM, PART_LEAVES, Known, maxima_near, well_conditioned
from oddsmodel.inference.maximise import Fit, maximise
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.measures.counts import exposure_counts
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.model.rows import COLUMN
from oddsmodel.passes import Leaf, Made, MemoryPasses, Passes

EDGE = 0.05
"""A record lies outside the overlap where its preference is below this or above one minus this."""

BINS = 20


@dataclass(frozen=True, eq=False)
class Preference:
    """The preference for a level of an exposure against its reference, both as places among its levels.

    weights (1 + q,): of the adjustment columns in its logit.
    """

    level: int
    reference: int
    weights: Array

    def of(self, rows: Leaf) -> tuple[NDArray[np.intp], Array]:
        """Which of some rows are at either level (a,), and their preference (a,)."""
        among = np.flatnonzero((rows["place"] == self.level) | (rows["place"] == self.reference))
        linear = rows["adjustment"].take(among, axis=0) @ self.weights
        return among, 1.0 / (1.0 + np.exp(-np.clip(linear, -500.0, 500.0)))


def beyond(preference: Array) -> NDArray[np.bool_]:
    """Which of some records with these preferences (a,) lie outside the overlap (a,)."""
    return (preference < EDGE) | (preference > 1.0 - EDGE)


@dataclass(frozen=True, eq=False)
class Comparison:
    """Records at a level of the exposure and at its reference.

    records, outside_records: of both groups. alone: whether the adjustment columns leave only one of the groups for
    some records, so that the exposure's own model has no finite maximum. at_level, at_reference (20,): records by
    preference in twentieths.
    """

    level: str
    reference: str
    preference: Preference
    records: int
    outside_records: int
    alone: bool
    at_level: tuple[int, ...]
    at_reference: tuple[int, ...]

    @property
    def share(self) -> float:
        return self.outside_records / self.records


@dataclass(frozen=True, eq=False)
class Beside:
    """Adds "adjustment" (n, 1 + q), ones and the columns of X not made from the exposure, and "place" (n,), that of the
    exposure's level, to rows that have the exposure's record column.

    kept (1 + q,): positions in X; the first is the intercept's, or -1 where X has none. places: of the levels of the
    record column among those of the model.
    """

    exposure: str
    kept: tuple[int, ...]
    places: NDArray[np.intp]

    def __call__(self, rows: Leaf) -> Leaf:
        adjustment = rows["X"].take(self.kept, axis=1)
        if self.kept[0] < 0:
            adjustment[:, 0] = 1.0
        made = {name: array for name, array in rows.items() if name in ("X", "events", "trials")}
        return {**made, "adjustment": adjustment, "place": self.places[rows[COLUMN + self.exposure]]}


@dataclass(frozen=True)
class AtLevel:
    """Makes of rows with their places: "X" the adjustment columns, "events" the records at a level, "trials" those at
    it or at its reference."""

    level: int
    reference: int

    def __call__(self, rows: Leaf) -> Leaf:
        place, records = rows["place"], rows.get("trials", 1.0)
        at = (place == self.level) * records
        return {"X": rows["adjustment"], "events": at, "trials": at + (place == self.reference) * records}


@dataclass(frozen=True, eq=False)
class Inside:
    """Makes of rows with their places: X, events and trials, 0 for the records outside the overlap."""

    preferences: tuple[Preference, ...]

    def __call__(self, rows: Leaf) -> Leaf:
        inside = np.ones(rows["place"].shape)
        for preference in self.preferences:
            among, value = preference.of(rows)
            inside[among[beyond(value)]] = 0.0
        trials = inside * rows["trials"] if "trials" in rows else inside
        return {"X": rows["X"], "events": inside * rows["events"], "trials": trials}


def compare(model: FittedModel, exposure: str) -> list[Comparison | None]:
    """Each level of a category exposure against its reference; None where the exposure's model did not converge.

    With S the fitted probability of the level among the records at it or at the reference, and P their share, the
    preference F has logit F = logit S - logit P (Walker et al. 2013, Comp Eff Res 3:11-20): the probability if both
    groups were equally large, so that a rare exposure does not look like a lack of overlap.
    """
    counted = exposure_counts(model, exposure)
    if counted is None:
        return []
    named = next((c.reference for c in model.design.columns if c.sources == (exposure,) and c.reference), None)
    reference = counted.levels.index(named) if named in counted.levels else 0
    if not counted.records[reference]:
        return []
    rows, parameters = with_places(model, exposure)
    found = [
        _preference(rows, parameters, level, reference, counted.records)
        for level in range(len(counted.levels))
        if level != reference and counted.records[level]
    ]
    preferences = [one[0] for one in found if one is not None]
    tallies = iter(rows.reduce([PreferenceKernel()], preferences)[0][0] if preferences else ())
    return [None if one is None else _comparison(*one, counted.levels, next(tallies)) for one in found]


def with_places(model: FittedModel, exposure: str) -> tuple[Passes, int]:
    """The rows of a model with what `Beside` adds, and how many adjustment columns that is, the ones among them."""
    columns = model.design.columns
    constant = next((i for i, column in enumerate(columns) if column.kind == "intercept"), -1)
    kept = [i for i, c in enumerate(columns) if c.kind != "intercept" and exposure not in c.sources]
    levels = model.columns[exposure].levels
    places = [levels.index(level) if level in levels else -1 for level in model.rows.levels[exposure]]
    beside = Beside(exposure, (constant, *kept), np.array([*places, -1], dtype=np.intp))
    return made_once(model.rows.with_columns, beside), len(beside.kept)


def made_once(passes: Passes, made: Made) -> Passes:
    """What is made of rows: made once where they are few and in memory, anew in every pass where they are many."""
    if isinstance(passes, MemoryPasses) and passes.rows <= PART_FROM:
        return MemoryPasses(made(passes.arrays))
    return passes.mapped(made)


def fit_kept(passes: Passes, start: Array) -> tuple[Fit, list[int]]:
    """The fit of events out of trials on X (m, p) without its aliased columns, and the columns kept.

    start (p,): coefficients to start from.
    """
    kept = list(range(start.size))
    fit = maximise(BinomialLikelihood.over(passes, start.size), start=start)
    if fit.status == "aliased":
        aliased = {relation.column for relation in fit.aliased}
        kept = [column for column in kept if column not in aliased]
    if 0 < len(kept) < start.size:
        rest = made_once(passes, Columns(tuple(kept)))
        fit = maximise(BinomialLikelihood.over(rest, len(kept)), start=start[kept])
    return fit, kept


@dataclass(frozen=True)
class Columns:
    """Makes of rows the same with these columns of X alone."""

    kept: tuple[int, ...]

    def __call__(self, rows: Leaf) -> Leaf:
        return {**rows, "X": rows["X"].take(self.kept, axis=1)}


def coefficients_near(passes: Passes, start: Array | None, parameters: int) -> Array | None:
    """The maximum (p,) over many rows from a start near it, that of a part of the rows where there is none.

    None where rows are few, or where it is not soon found: it is then for `fit_kept` to say what there is.
    """
    likelihood = BinomialLikelihood.over(passes, parameters)
    if likelihood.rows <= PART_FROM:
        return None
    if start is None:
        part = maximise(likelihood.thinned(PART_LEAVES))
        if part.status != "converged":
            return None
        start = part.coefficients
    at = likelihood.evaluate(start)
    if at.information is None or not well_conditioned(at.information[0]):
        return None
    (found,) = maxima_near(likelihood, Known(start, at.score[0], at.information[0]), [np.eye(parameters)])
    return None if found is None else found.point


def _preference(
    rows: Passes, parameters: int, level: int, reference: int, records: NDArray[np.int64]
) -> tuple[Preference, bool] | None:
    """The preference for a level, and whether its model has no finite maximum."""
    passes = made_once(rows, AtLevel(level, reference))
    share = records[level] / (records[level] + records[reference])
    constant = np.zeros(parameters)
    constant[0] = np.log(share / (1.0 - share))
    near = coefficients_near(passes, None, parameters)
    if near is not None:
        return Preference(level, reference, near - constant), False
    fit, kept = fit_kept(passes, constant)
    if fit.status not in ("converged", "no finite maximum"):
        return None
    weights = -constant
    weights[kept] += fit.coefficients
    return Preference(level, reference, weights), fit.status == "no finite maximum"


class PreferenceKernel:
    """For each of several preferences the records at the level and at the reference by preference in twentieths, and
    how many of both lie outside the overlap: (l, 2, 21)."""

    def leaf(self, rows: Leaf, preferences: Sequence[Preference]) -> tuple[Array]:
        found = np.empty((len(preferences), 2, BINS + 1))
        edges = np.linspace(0.0, 1.0, BINS + 1)
        for k, preference in enumerate(preferences):
            among, value = preference.of(rows)
            bins = np.minimum(np.searchsorted(edges, value, side="right") - 1, BINS - 1)
            bins += BINS * (rows["place"][among] == preference.reference)
            records = rows["trials"][among] if "trials" in rows else None
            found[k, :, :BINS] = np.bincount(bins, weights=records, minlength=2 * BINS).reshape(2, BINS)
            outside = beyond(value)
            found[k, 0, BINS] = np.count_nonzero(outside) if records is None else records[outside].sum()
            found[k, 1, BINS] = 0.0
        return (found,)


def _comparison(preference: Preference, alone: bool, levels: Sequence[str], tally: Array) -> Comparison:
    at_level, at_reference = np.rint(tally[:, :BINS]).astype(int).tolist()
    return Comparison(
        level=levels[preference.level],
        reference=levels[preference.reference],
        preference=preference,
        records=round(float(tally[:, :BINS].sum())),
        outside_records=round(float(tally[0, BINS])),
        alone=alone,
        at_level=tuple(at_level),
        at_reference=tuple(at_reference),
    )
