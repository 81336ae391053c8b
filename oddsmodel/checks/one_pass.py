"""What the checks of fit and influence need of the rows, found in one pass at the fitted coefficients."""

from __future__ import annotations

import weakref
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.one_step import AtTheFit, OneStep, joined, one_step, ranked
from oddsmodel.checks.probability_groups import (
    CLASSES,
    MOST_SORTED,
    OrderedRecords,
    classed_records,
    sorted_records,
)
from oddsmodel.checks.residuals import PatternResiduals, pattern_residuals
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import Leaf
from oddsmodel.passes.base import cut
from oddsmodel.passes.base import joined as joined_rows
from oddsmodel.randomness import generator

Array = NDArray[np.float64]

LISTED = 10
TOP_POINTS = 500
SAMPLED_POINTS = 1500

BLOCK_ROWS = 8192
"""Rows that are worked on at a time, so that they stay in the cache."""

ENOUGH = 5.0
"""Expected records of either outcome from which a pattern's count is near normal (Cochran 1954)."""


@dataclass(frozen=True)
class Sums:
    """Sums over the rows that stand for a record.

    patterns: how many there are. brier: of squared distances of outcomes from fitted probabilities. pearson, deviance:
    of squared residuals, the former possibly infinite. enough: rows with five expected records of either outcome;
    fewest: the smallest such number of any row. usable: rows that do not fix a coefficient alone. low, high: range of
    the linear predictor.
    """

    patterns: int
    brier: float
    pearson: float
    deviance: float
    enough: int
    fewest: float
    usable: int
    low: float
    high: float

    def plus(self, other: Sums) -> Sums:
        """Those of both."""
        return Sums(
            self.patterns + other.patterns,
            self.brier + other.brier,
            self.pearson + other.pearson,
            self.deviance + other.deviance,
            self.enough + other.enough,
            min(self.fewest, other.fewest),
            self.usable + other.usable,
            min(self.low, other.low),
            max(self.high, other.high),
        )


NOTHING = Sums(0, 0.0, 0.0, 0.0, 0, np.inf, 0, np.inf, -np.inf)


@dataclass(frozen=True)
class KeptRows:
    """A few rows (k,) in source order: position, trials, events, and a random number that drew some of them.

    steps: their one-step diagnostics.
    """

    position: NDArray[np.int64]
    trials: Array
    events: Array
    drawn: Array
    steps: OneStep

    def at(self, chosen: NDArray[np.int64]) -> KeptRows:
        """Some of them."""
        return KeptRows(
            self.position[chosen], self.trials[chosen], self.events[chosen], self.drawn[chosen], self.steps.at(chosen)
        )

    def plus(self, other: KeptRows) -> KeptRows:
        """Those of both that are still to be kept."""
        both = KeptRows(
            np.concatenate([self.position, other.position]),
            np.concatenate([self.trials, other.trials]),
            np.concatenate([self.events, other.events]),
            np.concatenate([self.drawn, other.drawn]),
            joined([self.steps, other.steps]),
        )
        return both.at(worth_keeping(both.steps, both.drawn))


def worth_keeping(steps: OneStep, drawn: Array) -> NDArray[np.int64]:
    """The rows that may be among those of most influence on the coefficients asked for, or be points of the figure."""
    usable = np.flatnonzero(~steps.alone)
    top = usable[ranked(steps.distance[usable], TOP_POINTS)]
    some = usable
    if usable.size > TOP_POINTS + SAMPLED_POINTS:
        some = usable[np.argpartition(drawn[usable], TOP_POINTS + SAMPLED_POINTS)[: TOP_POINTS + SAMPLED_POINTS]]
    return np.unique(np.concatenate([ranked(steps.score, LISTED), top, some]))


@dataclass(frozen=True)
class _Part:
    sums: Sums
    kept: KeptRows
    gathered: Leaf | None


@dataclass(frozen=True)
class _Look:
    """The work on the rows of a task. gather: whether the linear predictor of every row is handed back."""

    fit: AtTheFit
    seed: int
    model: str
    gather: bool

    def __call__(self, rows: Leaf, first: int, state: None) -> _Part:
        position = np.arange(first, first + len(rows["X"]))
        drawn = generator(self.seed, "influence figure", self.model, first).random(position.size)
        trials = rows.get("trials")
        if trials is not None and not trials.all():
            counted = np.flatnonzero(trials)
            rows, position, drawn = cut(rows, counted), position[counted], drawn[counted]
            trials = rows["trials"]
        linear, blocks, sums = [], [], NOTHING
        for at in range(0, max(position.size, 1), BLOCK_ROWS):
            block = cut(rows, slice(at, at + BLOCK_ROWS))
            residuals = pattern_residuals(block, self.fit.coefficients)
            steps = one_step(block["X"], residuals, self.fit)
            sums = sums.plus(_sums(block, residuals, steps))
            linear.append(residuals.linear)
            blocks.append(steps)
        steps = joined(blocks)
        chosen = worth_keeping(steps, drawn)
        kept = KeptRows(
            position[chosen],
            np.ones(chosen.size) if trials is None else trials[chosen],
            rows["events"][chosen],
            drawn[chosen],
            steps.at(chosen),
        )
        if not self.gather:
            return _Part(sums, kept, None)
        gathered: Leaf = {name: rows[name] for name in ("events", "trials") if name in rows}
        return _Part(sums, kept, {**gathered, "linear": np.concatenate(linear)})


def _sums(rows: Leaf, residuals: PatternResiduals, steps: OneStep) -> Sums:
    events, trials = rows["events"], rows.get("trials")
    others = (1.0 if trials is None else trials) - events
    rarer = np.minimum(residuals.probability, residuals.complement)
    if trials is not None:
        rarer *= trials
    with np.errstate(over="ignore"):
        pearson = float(residuals.pearson @ residuals.pearson)
    return Sums(
        patterns=events.size,
        brier=float(events @ residuals.complement**2 + others @ residuals.probability**2),
        pearson=pearson,
        deviance=float(residuals.deviance_share.sum()),
        enough=int(np.count_nonzero(rarer >= ENOUGH)),
        fewest=float(rarer.min(initial=np.inf)),
        usable=int(np.count_nonzero(~steps.alone)),
        low=float(residuals.linear.min(initial=np.inf)),
        high=float(residuals.linear.max(initial=-np.inf)),
    )


@dataclass(frozen=True)
class OnePass:
    """What was found of the rows.

    targets: the coefficients of interest. kept: the rows that move them most, and the points of the influence figure.
    ordered: the records by fitted probability; classed: whether in classes, the rows being too many to sort.
    """

    targets: tuple[int, ...]
    sums: Sums
    kept: KeptRows
    ordered: OrderedRecords
    classed: bool


def interest(model: FittedModel) -> tuple[int, ...]:
    """Positions of the exposure's columns, or of all but the intercept where there is no exposure."""
    columns = model.design.columns
    return model.exposure_indices or tuple(i for i, column in enumerate(columns) if column.role != "intercept")


_latest: tuple[weakref.ref[FittedModel], OnePass] | None = None


def one_pass(model: FittedModel) -> OnePass:
    """What is found of a model's rows. That of the latest model is remembered for as long as the model lives."""
    global _latest
    latest = _latest
    if latest is not None and latest[0]() is model:
        return latest[1]
    found = _found(model)
    _latest = weakref.ref(model, _forget), found
    return found


def _forget(gone: weakref.ref[FittedModel]) -> None:
    global _latest
    if _latest is not None and _latest[0] is gone:
        _latest = None


def _found(model: FittedModel) -> OnePass:
    targets = interest(model)
    fit = AtTheFit.of(model, targets)
    passes = model.rows.passes
    sort = passes.rows <= MOST_SORTED
    parts = passes.each(_Look(fit, model.seed, model.name, sort))
    first = next(parts)
    sums, kept, gathered = first.sums, first.kept, [first.gathered]
    for part in parts:
        sums, kept = sums.plus(part.sums), kept.plus(part.kept)
        gathered.append(part.gathered)
    if sort:
        ordered = sorted_records(joined_rows([rows for rows in gathered if rows is not None]))
    else:
        ordered = classed_records(passes, fit.coefficients, sums.low, sums.high, CLASSES)
    return OnePass(targets, sums, kept, ordered, not sort)
