"""How often the further tests of fit reject models that are right, and models that are wrong in known ways.

Run with `.venv/bin/python tests/studies/goodness_of_fit_null.py` (half an hour on two processors; `--replications`
makes it shorter). It writes its tables to goodness_of_fit_null.md beside it, and ends with status 1 where a test
rejects right models more often than its level allows, or so seldom that it is of no use.

The columns of the records are the same in every replication, the outcomes are drawn anew. The tests are those of the
program, with the conditions under which it withholds them.
"""

from __future__ import annotations

import argparse
import math
import sys
from collections.abc import Callable, Iterator, Mapping
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from scipy.special import expit
from threadpoolctl import threadpool_limits

from oddsmodel.checks import goodness_of_fit, half_normal
from oddsmodel.checks.added_fits import likelihood_ratio_tests
from oddsmodel.inference import Fit, maximise
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import MemoryPasses
from oddsmodel.randomness import generator

sys.path.insert(0, str(Path(__file__).parent.parent / "checks"))
from fit_models import grouped_model

SEED = 20261201
RECORDS = (100, 500, 2000)
AT_ONCE = 100
FEWEST = 500
"""Replications with a test from which its rate is held to a band."""
SHOWN = 0.05
"""Share of the replications that must have a test for its rates to be shown."""

ALLOWED: dict[float, tuple[float, float]] = {0.01: (0.002, 0.025), 0.05: (0.025, 0.075)}
"""By level: between which rates of rejection of right models must lie, three simulation errors allowed on either side.

The tests are asymptotic, and with a few hundred records their tails are heavier than those of a chi-square
distribution; two and a half times a level of 1%, and one and a half times one of 5%, is the most that a number beside
other evidence may have. All tests together, by Holm's smallest p, have no lower bound: tests that agree make them
reject seldom. Likelihood ratios are shown and not held to a band: with few records they reject more often than score
tests, which is why they are not counted.
"""

NAMES = {
    "hosmer_lemeshow": "Hosmer–Lemeshow",
    "standardised_pearson": "standardised Pearson",
    "unweighted_squares": "unweighted squares",
    "stukel": "Stukel",
    "link_test": "link",
    "information_matrix": "information matrix",
    "together": "all, by Holm",
    "stukel_ratio": "Stukel, likelihood ratio",
    "link_test_ratio": "link, likelihood ratio",
    "half_normal": "half-normal plot",
}
RATIO_EVERY = 10
"""Likelihood ratios, which take as long as all the rest, are done in one replication of so many."""

Array = np.ndarray
Design = tuple[Array, Array]


def _one_number(records: int, rng: np.random.Generator) -> Design:
    X = np.column_stack([np.ones(records), rng.normal(size=records)])
    return X, X @ [0.0, 1.0]


def _skewed(records: int, rng: np.random.Generator) -> Design:
    X = np.column_stack([np.ones(records), rng.chisquare(4, size=records)])
    return X, X @ [-4.9, 0.65]


def _four_columns(records: int, rng: np.random.Generator) -> Design:
    numbers = rng.normal(size=(records, 2))
    X = np.column_stack([np.ones(records), numbers, rng.random((records, 2)) < [0.3, 0.5]])
    return X, X @ [-1.0, 0.6, -0.4, 0.7, 0.3]


def _ten_columns(records: int, rng: np.random.Generator) -> Design:
    X = np.column_stack([np.ones(records), rng.normal(size=(records, 5)), rng.random((records, 5)) < 0.4])
    return X, X @ [-1.0, 0.4, -0.3, 0.3, 0.2, 0.0, 0.5, 0.4, -0.4, 0.2, 0.0]


def _rare(records: int, rng: np.random.Generator) -> Design:
    X = np.column_stack([np.ones(records), rng.normal(size=(records, 2)), rng.random(records) < 0.3])
    return X, X @ [-3.2, 0.5, -0.4, 0.7]


def _weak(records: int, rng: np.random.Generator) -> Design:
    X = np.column_stack([np.ones(records), rng.uniform(-1.0, 1.0, records)])
    return X, X @ [0.0, 0.3]


def _patterns(records: int, rng: np.random.Generator) -> Design:
    number = rng.integers(0, max(30, records // 5), records) / max(30, records // 5)
    X = np.column_stack([np.ones(records), number, rng.random(records) < 0.4])
    return X, X @ [-1.5, 2.0, 0.5]


RIGHT: dict[str, Callable[[int, np.random.Generator], Design]] = {
    "one normal column": _one_number,
    "one skewed column": _skewed,
    "weak effect": _weak,
    "four columns": _four_columns,
    "ten columns": _ten_columns,
    "event in 6% of records": _rare,
    "patterns of several records": _patterns,
}
"""What the model is fitted to, X (n, p), and the true linear predictor (n,)."""


def _two(records: int, rng: np.random.Generator) -> tuple[Array, Array, Array]:
    x, z = rng.normal(size=records), rng.random(records) < 0.4
    return np.column_stack([np.ones(records), x, z]), x, z.astype(float)


def _missing_square(records: int, rng: np.random.Generator) -> Design:
    X, x, z = _two(records, rng)
    return X, expit(-1.0 + 0.6 * x + 0.5 * z + 0.25 * x**2)


def _missing_square_alone(records: int, rng: np.random.Generator) -> Design:
    X, x, z = _two(records, rng)
    return X, expit(-1.0 + 0.5 * z + 0.25 * x**2)


def _missing_interaction(records: int, rng: np.random.Generator) -> Design:
    X, x, z = _two(records, rng)
    return X, expit(-1.0 + 0.2 * x + 0.5 * z + 0.6 * x * z)


def _log_log(records: int, rng: np.random.Generator) -> Design:
    X, x, z = _two(records, rng)
    return X, 1.0 - np.exp(-np.exp(-1.0 + x + 0.5 * z))


def _cauchy(records: int, rng: np.random.Generator) -> Design:
    X, x, z = _two(records, rng)
    return X, 0.5 + np.arctan(1.5 * x + 0.5 * z) / math.pi


WRONG: dict[str, Callable[[int, np.random.Generator], Design]] = {
    "square left out, beside the line": _missing_square,
    "square left out, no line": _missing_square_alone,
    "interaction left out": _missing_interaction,
    "complementary log-log link": _log_log,
    "Cauchy link": _cauchy,
}
"""What the model is fitted to, X (n, p), and the true risk (n,)."""


@dataclass(frozen=True)
class Setting:
    """A design with so many records."""

    name: str
    records: int

    def drawn(self) -> Design:
        """X (n, p) and the true risks (n,)."""
        rng = generator(SEED, "columns", self.name, self.records)
        if self.name in RIGHT:
            X, linear = RIGHT[self.name](self.records, rng)
            return np.asarray(X, dtype=float), expit(linear)
        X, risk = WRONG[self.name](self.records, rng)
        return np.asarray(X, dtype=float), risk


def _p_values(setting: Setting, first: int, number: int) -> dict[str, list[float | None]]:
    """The p-values of some replications; None where a test was withheld."""
    X, risk = setting.drawn()
    rows, index = np.unique(X, axis=0, return_inverse=True)
    trials = np.bincount(index.ravel()).astype(float)
    found: dict[str, list[float | None]] = {}
    base: FittedModel | None = None
    with threadpool_limits(1):
        for replicate in range(first, first + number):
            rng = generator(SEED, "outcomes", f"{setting.name} {setting.records}", replicate)
            events = np.bincount(index.ravel(), weights=rng.random(setting.records) < risk)
            fit = maximise(BinomialLikelihood(rows, events, trials=trials))
            if fit.status != "converged":
                continue
            base = grouped_model(rows, events, trials) if base is None else base
            model = _with_outcomes(base, events, fit)
            for name, p in _of_model(model, replicate % RATIO_EVERY == 0).items():
                found.setdefault(name, []).append(p)
    return found


def _with_outcomes(base: FittedModel, events: Array, fit: Fit) -> FittedModel:
    """The model of the same rows with other events (m,)."""
    assert isinstance(base.rows.passes, MemoryPasses)
    passes = MemoryPasses({**base.rows.passes.arrays, "events": events})
    return replace(
        base,
        rows=replace(base.rows, passes=passes),
        events=round(float(events.sum())),
        likelihood=fit.likelihood,
        fit=fit,
    )


def _of_model(model: FittedModel, ratios: bool) -> dict[str, float | None]:
    added, tests = goodness_of_fit.fit_tests(model)
    found = {name: test.p for name, test in tests.items()}
    together = goodness_of_fit.weighed(tests, goodness_of_fit.Sizes.of(model))
    found["together"] = None if together is None else together.p
    if ratios:
        beside = likelihood_ratio_tests(model, added, goodness_of_fit.REFITTED)
        found |= {f"{name}_ratio": test.p for name, test in beside.items()}
    return found


PATTERNS = 60

HALF_NORMAL = {
    "twelve records a pattern, right model": (12, 0.0),
    "one record a pattern, right model": (1, 0.0),
    "twelve records a pattern, log odds vary by 0.5": (12, 0.5),
}
"""Records of each pattern, and the standard deviation by which log odds vary beside the model."""


def _half_normal(setting: Setting, first: int, number: int) -> dict[str, list[float | None]]:
    """p-values of the half-normal plot."""
    each, spread = HALF_NORMAL[setting.name]
    rng = generator(SEED, "patterns", setting.name, setting.records)
    X = np.column_stack([np.ones(setting.records), rng.normal(size=setting.records), rng.random(setting.records) < 0.4])
    trials = np.full(len(X), each)
    found: list[float | None] = []
    with threadpool_limits(1):
        for replicate in range(first, first + number):
            rng = generator(SEED, "half-normal", setting.name, replicate)
            linear = X @ [-0.5, 0.7, 0.5] + spread * rng.normal(size=len(X))
            events = rng.binomial(trials, expit(linear)).astype(float)
            if maximise(BinomialLikelihood(X, events, trials=trials)).status == "converged":
                model = replace(grouped_model(X, events, trials), seed=replicate)
                found.append(half_normal.check(model).statistics["p"])
    return {"half_normal": found}


@dataclass(frozen=True)
class Task:
    setting: Setting
    first: int
    number: int


def _run(task: Task) -> dict[str, list[float | None]]:
    work = _half_normal if task.setting.name in HALF_NORMAL else _p_values
    return work(task.setting, task.first, task.number)


@dataclass
class Seen:
    """The p-values of a test that were not withheld, out of so many replications in which it was done."""

    values: list[float]
    replications: int = 0

    def rate(self, level: float) -> float:
        return float(np.mean(np.asarray(self.values) <= level))


Found = dict[Setting, dict[str, Seen]]


def _simulated(settings: Mapping[Setting, int], workers: int) -> Found:
    """All p-values of so many replications of each setting."""
    tasks = [
        Task(setting, first, min(AT_ONCE, number - first))
        for setting, number in settings.items()
        for first in range(0, number, AT_ONCE)
    ]
    found: Found = {setting: {} for setting in settings}
    with ProcessPoolExecutor(workers) as pool:
        for task, part in zip(tasks, pool.map(_run, tasks), strict=True):
            for name, values in part.items():
                seen = found[task.setting].setdefault(name, Seen([]))
                seen.replications += len(values)
                seen.values += [p for p in values if p is not None]
    return found


def _outside(name: str, seen: Seen) -> list[float]:
    """The levels at which a right model is rejected more, or less, often than the band allows."""
    if len(seen.values) < FEWEST or name.endswith("_ratio"):
        return []
    levels = []
    for level, (lower, upper) in ALLOWED.items():
        error = 3.0 * math.sqrt(level * (1.0 - level) / len(seen.values))
        least = 0.0 if name in ("together", "half_normal") else lower - error
        if not least <= seen.rate(level) <= upper + error:
            levels.append(level)
    return levels


def _cell(seen: Seen | None) -> str:
    """Rates of rejection in per cent, and the per cent withheld in brackets where there are any."""
    if seen is None:
        return ""
    withheld = round(100 * (1 - len(seen.values) / seen.replications))
    if len(seen.values) < SHOWN * seen.replications:
        return "withheld"
    return " / ".join(f"{100 * seen.rate(level):.1f}" for level in ALLOWED) + (f" ({withheld})" if withheld else "")


def _table(found: Found) -> Iterator[str]:
    names = [name for name in NAMES if any(name in by_name for by_name in found.values())]
    yield f"| records drawn | number | {' | '.join(NAMES[name] for name in names)} |"
    yield "|---|---|" + "---|" * len(names)
    for setting, by_name in found.items():
        yield f"| {setting.name} | {setting.records} | {' | '.join(_cell(by_name.get(name)) for name in names)} |"


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--replications", type=int, default=10_000)
    parser.add_argument("--workers", type=int, default=2)
    given = parser.parse_args()
    number, fewer = given.replications, max(1, given.replications // 10)
    right = {Setting(name, n): number if n <= 500 else number // 2 for name in RIGHT for n in RECORDS}
    wrong = {Setting(name, n): fewer for name in WRONG for n in RECORDS}
    plots = {Setting(name, PATTERNS): fewer for name in HALF_NORMAL}
    found = _simulated({**right, **wrong, **plots}, given.workers)
    lines = [
        "# Further tests of fit: right and wrong models",
        "",
        f"Made by `goodness_of_fit_null.py`: {number} replications of every right model, {number // 2} with 2000 "
        "records",
        f"(one in {RATIO_EVERY} of either for the likelihood ratios); {fewer} of every wrong model and of the "
        "half-normal",
        f"plots (39 simulations each, {PATTERNS} patterns). Cells: rejected at 1% / at 5%, in per cent of the",
        "replications in which the test was not withheld; in brackets the per cent withheld. The bands that right",
        "models are held to stand in the script.",
        "",
        "## Right models",
        "",
        *_table({setting: found[setting] for setting in right}),
        "",
        "## Wrong models",
        "",
        *_table({setting: found[setting] for setting in wrong}),
        "",
        "## Half-normal plots",
        "",
        *_table({setting: found[setting] for setting in plots}),
        "",
    ]
    Path(__file__).with_suffix(".md").write_text("\n".join(lines), encoding="utf-8")
    failed = False
    for setting, by_name in found.items():
        if setting in wrong or HALF_NORMAL.get(setting.name, (0, 0.0))[1] > 0.0:
            continue
        for name, seen in by_name.items():
            for level in _outside(name, seen):
                print(f"outside its band: {setting.name}, {setting.records} records, {NAMES[name]}, level {level:g}")
                failed = True
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
