"""Small invented records for plans by each method, and the same models by formulas written out here."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy import optimize, stats

from oddsmodel.study.run import RunOutcome, run_plan

Array = NDArray[np.float64]

PLAN = """
[study]
title = "Prophylaxis and wound infection"
question = "Is prophylaxis associated with fewer wound infections?"
design = "{design}"
[records]
source = "records.csv"
{records}
[outcome]
column = "infected"
event = "yes"
{columns}
[[models]]
name = "main"
formula = "infected ~ {formula}"
exposures = [{exposures}]
{more}
[report]
audience = "{audience}"
"""

COLUMNS = {
    "prophylaxis": 'kind = "category"\nlevels = ["no", "yes"]',
    "age": 'kind = "number"\nper = 10',
    "dirty": 'kind = "yes-no"',
    "ward": 'kind = "category"\nlevels = ["A", "B", "C"]',
}

ORDERED = 'kind = "ordered"\nlevels = ["A", "B", "C"]'

HALF_QUANTILE = float(stats.chi2.ppf(0.95, 1)) / 2.0


def records(n: int = 120, seed: int = 3, *, prophylaxis: float = -0.8, nobody: str = "") -> pd.DataFrame:
    """nobody: of "prophylaxis" or "ward" the group in which nobody has the event."""
    rng = np.random.default_rng(seed)
    age = rng.integers(30, 80, n)
    treated = rng.random(n) < 0.3
    dirty = rng.random(n) < 0.4
    ward = rng.choice(["A", "B", "C"], n, p=[0.5, 0.3, 0.2])
    linear = -1.2 + 0.03 * (age - 55) + dirty + prophylaxis * treated + 0.4 * (ward == "B")
    infected = rng.random(n) < 1 / (1 + np.exp(-linear))
    infected &= ~(treated & (nobody == "prophylaxis")) & ~((ward == "C") & (nobody == "ward"))
    words = {"infected": infected, "prophylaxis": treated, "dirty": dirty}
    yes_no = {name: np.where(is_so, "yes", "no") for name, is_so in words.items()}
    return pd.DataFrame(yes_no | {"age": age, "ward": ward})


def table(a: int, b: int, c: int, d: int) -> pd.DataFrame:
    """Exposed with and without the event, unexposed with and without it, as counted records."""
    cells = [("yes", "yes", a), ("no", "yes", b), ("yes", "no", c), ("no", "no", d)]
    return pd.DataFrame(cells, columns=["infected", "prophylaxis", "n"])


def run(
    folder: Path,
    frame: pd.DataFrame,
    formula: str = "prophylaxis + age + dirty",
    more: str = "",
    *,
    design: str = "cohort",
    exposures: tuple[str, ...] = ("prophylaxis",),
    records: str = "",
    audience: str = "internal",
    **columns: str,
) -> tuple[RunOutcome, dict[str, Any]]:
    """Run the plan in a folder; columns: sections in place of those of `COLUMNS`."""
    frame.to_csv(folder / "records.csv", index=False)
    sections = {name: text for name, text in (COLUMNS | columns).items() if name in frame}
    text = PLAN.format(
        design=design,
        formula=formula,
        exposures=", ".join(f'"{name}"' for name in exposures),
        records=records,
        audience=audience,
        more=more,
        columns="\n".join(f"[columns.{name}]\n{lines}" for name, lines in sections.items()),
    )
    (folder / "plan.toml").write_text(text, encoding="utf-8")
    outcome = run_plan(folder / "plan.toml")
    (path,) = outcome.folder.glob("results*.json")
    return outcome, json.loads(path.read_text(encoding="utf-8"))


def report(outcome: RunOutcome) -> str:
    (path,) = outcome.folder.glob("report*.html")
    return path.read_text(encoding="utf-8")


def coefficient(model: dict[str, Any], term: str, level: str | None = None) -> dict[str, Any]:
    return next(one for one in model["coefficients"] if one["term"] == term and level in (None, one["level"]))


def matrix(frame: pd.DataFrame, *names: str) -> tuple[Array, Array]:
    """Ones, then an indicator of "yes" or the numbers of each column (wards: of B, then of C); and the events."""
    columns: list[Any] = [np.ones(len(frame))]
    for name in names:
        if name == "ward":
            columns += [frame.ward == "B", frame.ward == "C"]
        else:
            columns.append(frame[name] == "yes" if name != "age" else frame[name])
    return np.column_stack(columns).astype(float), (frame.infected == "yes").to_numpy(float)


def log_likelihood(X: Array, y: Array, beta: Array) -> float:
    linear = X @ beta
    return float(y @ linear - np.logaddexp(0.0, linear).sum())


def penalised(X: Array, y: Array) -> Callable[[Array], float]:
    """The log-likelihood with half the log determinant of the information (Firth 1993)."""

    def value(beta: Array) -> float:
        risk = 1 / (1 + np.exp(-(X @ beta)))
        information = (X * (risk * (1 - risk))[:, None]).T @ X
        return log_likelihood(X, y, beta) + 0.5 * float(np.linalg.slogdet(information)[1])

    return value


def maximum(value: Callable[[Array], float], start: Array) -> tuple[Array, float]:
    """The highest point, by scipy, in two searches that do without derivatives of ours."""
    options = {"xatol": 1e-11, "fatol": 1e-13, "maxiter": 40_000, "maxfev": 40_000}
    near = optimize.minimize(lambda beta: -value(beta), start, method="BFGS").x
    found = optimize.minimize(lambda beta: -value(beta), near, method="Nelder-Mead", options=options)
    return found.x, -float(found.fun)


def profile_limit(value: Callable[[Array], float], best: Array, height: float, place: int, towards: float) -> float:
    """The end of the profile interval of one coefficient: refits by scipy with it held, and a root."""
    others = [k for k in range(best.size) if k != place]
    start = best[others]

    def short(theta: float) -> float:
        nonlocal start

        def held(rest: Array) -> float:
            beta = np.empty(best.size)
            beta[place], beta[others] = theta, rest
            return value(beta)

        start, top = maximum(held, start)
        return top - (height - HALF_QUANTILE)

    far = towards
    while short(best[place] + far) > 0.0:
        far *= 2.0
    return float(optimize.brentq(short, best[place], best[place] + far, xtol=1e-9))
