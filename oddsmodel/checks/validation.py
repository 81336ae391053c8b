"""Internal validation: bootstrap optimism and repeated cross-validation of the measures of prediction."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.performance import (
    Pairs,
    Scores,
    calibration_in_the_large,
    calibration_line,
    squared_distance,
)
from oddsmodel.checks.refits import Refits
from oddsmodel.checks.resamples import Counts, Population
from oddsmodel.passes.local import in_order
from oddsmodel.randomness import generator

Array = NDArray[np.float64]

VALUES_AT_ONCE = 1 << 22
MOST_AT_ONCE = 50
"""Data sets are fitted so many at a time, their rows together no more than these."""

Told = Callable[[int], None]


class Measures(NamedTuple):
    """None where the design knows no such measure.

    area: under the curve. slope: of the calibration line. in_the_large: its intercept with the slope held at 1. brier:
    the mean squared distance of outcomes from probabilities.
    """

    area: float | None
    slope: float | None
    in_the_large: float | None
    brier: float | None


@dataclass(frozen=True)
class Validation:
    """What is validated.

    absolute: whether probabilities have a meaning, and with them all that rests on the intercept. balanced: whether the
    model has an intercept, so that a fit's own records have slope 1 and intercept 0. seed, name: of the plan and model.
    """

    population: Population
    refits: Refits
    absolute: bool
    balanced: bool
    seed: int
    name: str

    def measured(self, linear: Array, events: Counts, trials: Counts, pairs: Pairs) -> Measures | None:
        """The measures of a linear predictor (m,) on records, of which these pairs are compared; None without any."""
        line = calibration_line(linear, events, trials)
        level = calibration_in_the_large(linear, events, trials)
        if line is None or level is None or pairs.number == 0.0:
            return None
        return self._kept(pairs, line.slope, level, squared_distance(linear, events, trials) / float(trials.sum()))

    def _kept(self, pairs: Pairs, slope: float, level: float, brier: float) -> Measures:
        area = pairs.right / pairs.number
        return Measures(area, slope, level, brier) if self.absolute else Measures(area, slope, None, None)

    def own(self, linear: Array, events: Counts, trials: Counts, pairs: Pairs) -> Measures | None:
        """The measures on the records that the fit was made of."""
        if not self.balanced or pairs.number == 0.0:
            return self.measured(linear, events, trials, pairs)
        return self._kept(pairs, 1.0, 0.0, squared_distance(linear, events, trials) / float(trials.sum()))


@dataclass(frozen=True)
class Optimism:
    """optimism: on average over the resamples fitted; None where none was."""

    optimism: Measures | None
    fitted: int
    resamples: int


def bootstrap_optimism(validation: Validation, resamples: int, told: Told) -> Optimism:
    """How much better a fit does on the records it was made of than on others, for each measure.

    Efron & Gong 1983, American Statistician 37:36-48, section 7; Harrell, Lee & Mark 1996, Statistics in Medicine
    15:361-387, section 6: the model is fitted again to each resample, and its measures there, less those of the same
    fit on the original records, are averaged.
    """
    population = validation.population
    events, trials = population.counted(population.cells)
    found: list[Measures] = []
    for batch in _batches(resamples, population.rows):
        drawn = np.stack(
            [population.drawn(generator(validation.seed, "bootstrap", validation.name, one)) for one in batch]
        )
        happened, counted = population.counted(drawn)
        gap = _Gap(validation, validation.refits.linear(happened, counted), happened, counted, events, trials)
        found += [one for one in in_order(gap, range(len(batch))) if one is not None]
        told(len(batch))
    return Optimism(_mean(found), len(found), resamples)


@dataclass(frozen=True)
class _Gap:
    """The measures of a fit on its own resample less those on the original records."""

    validation: Validation
    linear: Sequence[Array | None]
    happened: Counts
    counted: Counts
    events: Counts
    trials: Counts

    def __call__(self, one: int) -> Measures | None:
        rows = self.linear[one]
        if rows is None:
            return None
        scores, original = Scores.of(rows), (self.events, self.trials)
        drawn = self.happened[one], self.counted[one]
        own = self.validation.own(rows, *drawn, scores.pairs(*drawn))
        return _less(own, self.validation.measured(rows, *original, scores.pairs(*original)))


@dataclass(frozen=True)
class CrossValidated:
    """measures: on average over the repeats; None where no fold could be fitted."""

    measures: Measures | None
    fitted: int
    folds: int
    repeats: int


def cross_validated(validation: Validation, folds: int, repeats: int, told: Told) -> CrossValidated:
    """The measures on records held out: each fold's by the fit to the others, all folds together, repeated.

    Stone 1974, Journal of the Royal Statistical Society B 36:111-147. Slope, intercept and score are those of all
    records of a repeat at once; the area is of pairs within a fold, as linear predictors of two fits are not compared.
    With likelihood ratio LR the slope is too low by about 2 / LR on average: records left out one by one give
    1 − p / LR for p coefficients, and the mean of the true slope is that of 1 − (p − 2) / LR (by Stein's identity for
    normal estimates: 1981, Annals of Statistics 9:1135-1151).
    """
    population = validation.population
    found: list[Measures] = []
    fitted = 0
    for repeat in range(repeats):
        held = population.dealt(folds, generator(validation.seed, "cross-validation", validation.name, repeat))
        linear = validation.refits.linear(*population.counted(population.cells - held))
        known = [fold for fold in range(folds) if linear[fold] is not None]
        fitted += len(known)
        if known:
            measures = _pooled(validation, [linear[fold] for fold in known], held[known])
            found += [] if measures is None else [measures]
        told(folds)
    return CrossValidated(_mean(found), fitted, folds, repeats)


def _pooled(validation: Validation, linear: Sequence[Array | None], held: Counts) -> Measures | None:
    events, trials = validation.population.counted(held)
    pieces: list[tuple[Array, Counts, Counts]] = []
    number = right = 0.0
    for rows, happened, counted in zip(linear, events, trials, strict=True):
        used = np.flatnonzero(counted)
        if rows is None or not used.size:
            continue
        piece = rows[used], happened[used], counted[used]
        pairs = Scores.of(piece[0]).pairs(*piece[1:])
        number, right = number + pairs.number, right + pairs.right
        pieces.append(piece)
    together = [np.concatenate(parts) for parts in zip(*pieces, strict=True)]
    return validation.measured(together[0], together[1], together[2], Pairs(number, right))


def _batches(number: int, rows: int) -> Iterator[range]:
    size = max(1, min(MOST_AT_ONCE, VALUES_AT_ONCE // max(1, rows)))
    return (range(first, min(first + size, number)) for first in range(0, number, size))


def _less(one: Measures | None, other: Measures | None) -> Measures | None:
    if one is None or other is None:
        return None
    return Measures(*(None if a is None or b is None else a - b for a, b in zip(one, other, strict=True)))


def _mean(found: Sequence[Measures]) -> Measures | None:
    if not found:
        return None
    columns = zip(*found, strict=True)
    return Measures(*(None if values[0] is None else float(np.mean(values)) for values in columns))
