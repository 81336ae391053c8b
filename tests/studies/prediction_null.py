"""Whether Spiegelhalter's test keeps its level on the records fitted, and whether validation tells the truth.

Run with `.venv/bin/python tests/studies/prediction_null.py` (some ten minutes on two processors; `--replications`
makes it shorter). It writes its tables to prediction_null.md beside it, and ends with status 1 where a share or a mean
lies outside its band.

1. Records whose columns are drawn once; outcomes are drawn anew from a logistic model that holds, the model is fitted,
   and Spiegelhalter's test is done with what the columns explain taken out, as the program does it. Where the program
   would leave the test out, it is counted as such. Beside it, the usual form of the test.
2. Records drawn anew; the model fitted, its area, slope and Brier score corrected for optimism and cross-validated, and
   the same measures to be expected among many other records from the same population: the truth they stand for.
   The cross-validated slope is too low by about 2 over the likelihood ratio on average: for normal estimates of p
   coefficients the mean of the true slope is that of 1 − (p − 2) / LR (Stein 1981, Annals of Statistics 9:1135-1151),
   and leaving records out one by one gives 1 − p / LR.
"""

from __future__ import annotations

import argparse
import itertools
import math
import os
import sys
from collections.abc import Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from pathlib import Path
from types import SimpleNamespace

import numpy as np
from scipy.special import erfc, expit
from scipy.stats import kstest
from threadpoolctl import threadpool_limits

from oddsmodel.checks.performance import Scores, calibration_line, squared_distance
from oddsmodel.checks.refits import SameColumns
from oddsmodel.checks.resamples import Population
from oddsmodel.checks.spiegelhalter import spiegelhalter
from oddsmodel.checks.validation import Validation, bootstrap_optimism, cross_validated
from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.randomness import generator

SEED = 20261201
AT_ONCE = 100
NOTHING = 0.01
"""Fewer replications with a test than this share, and there is nothing to judge."""

LEVELS: dict[float, tuple[float, float]] = {0.05: (0.040, 0.060), 0.01: (0.006, 0.016)}
"""Shares of p-values below a level that are put up with, three simulation errors beyond them on either side."""

FARTHEST = 0.025
"""The largest distance of the distribution of p-values from the uniform one, beyond that of chance."""

MEANS: dict[str, float] = {"area": 0.012, "slope": 0.08, "Brier score": 0.004}
"""How far the mean of a corrected or cross-validated measure may lie from the mean truth."""


@dataclass(frozen=True)
class Scene:
    """columns: how many; kind: "normal", "yes–no" or "skew"; share: of events, about; slope: of each column."""

    records: int
    columns: int
    kind: str
    share: float
    slope: float

    def drawn(self, rng: np.random.Generator, records: int) -> np.ndarray:
        """The model matrix (records, columns + 1)."""
        X = rng.normal(size=(records, self.columns))
        if self.kind == "yes–no":
            X = (X > 0.3).astype(np.float64)
        elif self.kind == "skew":
            X = np.exp(0.8 * X)
        return np.column_stack([np.ones(records), X])

    @property
    def coefficients(self) -> np.ndarray:
        signs = np.where(np.arange(self.columns) % 2, -1.0, 1.0)
        return np.concatenate([[math.log(self.share / (1 - self.share))], self.slope * signs])


SCENES = (
    Scene(100, 2, "normal", 0.5, 0.8),
    Scene(200, 3, "normal", 0.3, 0.6),
    Scene(200, 4, "yes–no", 0.3, 0.8),
    Scene(500, 5, "yes–no", 0.1, 0.7),
    Scene(500, 10, "normal", 0.2, 0.4),
    Scene(1000, 20, "normal", 0.3, 0.3),
    Scene(2000, 5, "normal", 0.05, 0.5),
    Scene(3000, 3, "skew", 0.1, 0.3),
)

POPULATIONS = (Scene(200, 5, "normal", 0.35, 0.4), Scene(300, 8, "normal", 0.2, 0.4), Scene(500, 6, "yes–no", 0.3, 0.5))
OTHERS = 20_000
RESAMPLES, FOLDS, REPEATS = 100, 10, 3

Tested = tuple[float | None, float]


def tested(scene: Scene, first: int, number: int) -> list[Tested]:
    """p-values by the program, None where it leaves the test out, and by the usual form."""
    X = scene.drawn(generator(SEED, "columns", str(scene)), scene.records)
    risk = expit(X @ scene.coefficients)
    found: list[Tested] = []
    for replicate in range(first, first + number):
        y = (generator(SEED, "outcomes", str(scene), replicate).random(scene.records) < risk).astype(np.float64)
        fit = maximise(BinomialLikelihood(X, y))
        if fit.status != "converged":
            continue
        test = spiegelhalter(fit)
        p = expit(X @ fit.coefficients)
        usual = ((y - p) @ (1 - 2 * p)) / math.sqrt((p * (1 - p)) @ (1 - 2 * p) ** 2)
        found.append(
            (test.p if test is not None and test.near_normal else None, float(erfc(abs(usual) / math.sqrt(2))))
        )
    return found


@dataclass(frozen=True)
class Row:
    """What the test did in a scene; below: shares of p-values below each level, and of those of the usual form."""

    scene: Scene
    replications: int
    withheld: float
    below: tuple[float, ...]
    usual: tuple[float, ...]
    farthest: float
    number: int

    def right(self) -> bool:
        if self.number < NOTHING * self.replications:
            return True
        for share, (level, (least, most)) in zip(self.below, LEVELS.items(), strict=True):
            error = math.sqrt(level * (1 - level) / self.number)
            if not least - 3 * error <= share <= most + 3 * error:
                return False
        return self.farthest <= FARTHEST + 1.63 / math.sqrt(self.number)


def judged(scene: Scene, found: Sequence[Tested]) -> Row:
    p = np.array([one for one, _ in found if one is not None])
    usual = np.array([one for _, one in found])
    return Row(
        scene,
        len(found),
        1.0 - p.size / len(found),
        tuple(float((p < level).mean()) if p.size else math.nan for level in LEVELS),
        tuple(float((usual < level).mean()) for level in LEVELS),
        float(kstest(p, "uniform").statistic) if p.size else math.nan,
        p.size,
    )


def validated(scene: Scene, first: int, number: int) -> list[np.ndarray]:
    """Apparent, corrected, cross-validated and true area, slope and Brier score (4, 3) of each replication."""
    others = scene.drawn(generator(SEED, "others", str(scene)), OTHERS)
    expected = expit(others @ scene.coefficients)
    found: list[np.ndarray] = []
    for replicate in range(first, first + number):
        rng = generator(SEED, "records", str(scene), replicate)
        X = scene.drawn(rng, scene.records)
        y = (rng.random(scene.records) < expit(X @ scene.coefficients)).astype(np.int64)
        fit = maximise(BinomialLikelihood(X, y))
        if fit.status != "converged":
            continue
        refits = SameColumns(SimpleNamespace(fit=fit))
        cells = np.concatenate([y, 1 - y])
        made = Validation(Population(cells, apart=False), refits, True, True, SEED + replicate, str(scene))
        optimism = bootstrap_optimism(made, RESAMPLES, lambda steps: None).optimism
        crossed = cross_validated(made, FOLDS, REPEATS, lambda steps: None).measures
        own = _measures(X @ fit.coefficients, y)
        truth = _measures(others @ fit.coefficients, expected)
        if optimism is None or crossed is None:
            continue
        gap = np.array([optimism.area, optimism.slope, optimism.brier])
        found.append(np.array([own, own - gap, [crossed.area, crossed.slope, crossed.brier], truth]))
    return found


def _measures(linear: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Area, slope and Brier score where outcomes, or their expected values, are y."""
    ones = np.ones_like(y)
    pairs, line = Scores.of(linear).pairs(y, ones), calibration_line(linear, y, ones)
    slope = math.nan if line is None else line.slope
    return np.array([pairs.right / pairs.number, slope, squared_distance(linear, y, ones) / y.size])


def _share(value: float) -> str:
    return "" if math.isnan(value) else f"{100 * value:.1f}%"


def table(rows: Sequence[Row], means: Sequence[tuple[Scene, int, np.ndarray]], replications: int) -> str:
    """Both parts in words and their tables, in Markdown."""
    bands = ", ".join(f"{100 * low:.1f}% to {100 * high:.1f}% below {level:g}" for level, (low, high) in LEVELS.items())
    first = [
        "# Prediction: the null distribution of Spiegelhalter’s test, and validation against the truth",
        "",
        f"Made by `prediction_null.py`. First part: {replications} replications of each scene, outcomes drawn from the",
        "model fitted. “Left out” is the share of replications in which the program would give no test, its statistic",
        "not being near normal; the shares of p-values below a level are among the others, and the distance is that of",
        "their distribution from the uniform one. A run must show",
        f"{bands}, give or take three simulation errors,",
        f"and a distance of at most {FARTHEST:g} beyond that of chance. The usual form hardly ever finds anything.",
        "",
        "| records | columns | share of events about | left out | p under 0.05 | p under 0.01 | distance |"
        " usual form: p under 0.05 |",
        "|---|---|---|---|---|---|---|---|",
    ]
    for row in rows:
        scene = row.scene
        cells = (
            str(scene.records),
            f"{scene.columns} {scene.kind}",
            f"{scene.share:g}",
            _share(row.withheld),
            *(_share(share) for share in row.below),
            "" if math.isnan(row.farthest) else f"{row.farthest:.3f}",
            _share(row.usual[0]),
        )
        first.append(f"| {' | '.join(cells)} |")
    allowed = ", ".join(f"{name} {allowed:g}" for name, allowed in MEANS.items())
    second = [
        "",
        f"Second part: means over data sets, each validated by {RESAMPLES} resamples and {FOLDS} folds {REPEATS} times",
        f"over, beside the same fits’ measures among {OTHERS} other records. A corrected mean may differ from the true",
        f"one by {allowed}; a cross-validated one, of fits to a tenth",
        "fewer records, by twice as much: its slope is too low by about 2 over the likelihood ratio.",
        "",
        "| records | columns | data sets | measure | on the records fitted | corrected | cross-validated | in truth |",
        "|---|---|---|---|---|---|---|---|",
    ]
    for scene, number, mean in means:
        for place, name in enumerate(MEANS):
            values = " | ".join(f"{value:.3f}" for value in mean[:, place])
            second.append(f"| {scene.records} | {scene.columns} {scene.kind} | {number} | {name} | {values} |")
    return "\n".join([*first, *second, ""])


def _batches(number: int, size: int) -> tuple[list[int], list[int]]:
    firsts = list(range(0, number, size))
    return firsts, [min(size, number - first) for first in firsts]


def main() -> int:
    parser = argparse.ArgumentParser(description="Null distribution of a calibration test; validation and the truth.")
    parser.add_argument("--replications", type=int, default=10_000)
    parser.add_argument("--data-sets", type=int, default=500)
    parser.add_argument("--into", type=Path, default=Path(__file__).with_suffix(".md"))
    asked = parser.parse_args()
    os.nice(19)
    rows: list[Row] = []
    means: list[tuple[Scene, int, np.ndarray]] = []
    with ProcessPoolExecutor(2, initializer=threadpool_limits, initargs=(1,)) as pool:
        for scene in SCENES:
            parts = pool.map(tested, itertools.repeat(scene), *_batches(asked.replications, AT_ONCE))
            rows.append(judged(scene, list(itertools.chain.from_iterable(parts))))
            print(rows[-1], file=sys.stderr, flush=True)
        for scene in POPULATIONS:
            parts = pool.map(validated, itertools.repeat(scene), *_batches(asked.data_sets, 25))
            found = list(itertools.chain.from_iterable(parts))
            means.append((scene, len(found), np.mean(found, axis=0)))
            print(means[-1], file=sys.stderr, flush=True)
    text = table(rows, means, asked.replications)
    asked.into.write_text(text, encoding="utf-8")
    print(text)
    wrong = [str(row.scene) for row in rows if not row.right()]
    for scene, _, mean in means:
        _, corrected, crossed, truth = mean
        allowed = np.array(list(MEANS.values()))
        if (np.abs(corrected - truth) > allowed).any() or (np.abs(crossed - truth) > 2 * allowed).any():
            wrong.append(str(scene))
    for one in wrong:
        print(f"outside its band: {one}")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main())
