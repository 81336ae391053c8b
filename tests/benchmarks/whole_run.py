"""From the command to the report, beside pandas + patsy + statsmodels for the plain Wald fit, in one process.

Run: python tests/benchmarks/whole_run.py [records ...]     (the example and 100,000 records by default)
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import pandas as pd
import patsy
import statsmodels.api as sm

from oddsmodel.study.run import run_plan

PLAN = """
[study]
title = "Benchmark"
question = "Is the exposure associated with the outcome?"
design = "cohort"
[records]
source = "records.csv"
[outcome]
column = "outcome"
event = "yes"
[columns.exposure]
kind = "category"
levels = ["none", "some", "much"]
reference = "none"
[columns.region]
kind = "category"
[columns.ward]
kind = "category"
[[models]]
name = "main"
formula = "outcome ~ exposure + region + ward + age + weight + score"
exposures = ["exposure"]
"""

FORMULA = "C(exposure, Treatment('none')) + region + ward + age + weight + score"


def write_records(folder: Path, records: int) -> Path:
    rng = np.random.default_rng(5)
    frame = pd.DataFrame(
        {
            "exposure": rng.choice(["none", "some", "much"], records, p=[0.5, 0.3, 0.2]),
            "region": rng.choice([f"region {i}" for i in range(6)], records),
            "ward": rng.choice(["medical", "surgical", "other"], records),
            "age": rng.integers(18, 95, records),
            "weight": np.round(rng.normal(75, 14, records), 1),
            "score": np.round(rng.normal(size=records), 3),
        }
    )
    linear = -2.2 + 0.3 * (frame.exposure == "some") + 0.6 * (frame.exposure == "much") + 0.02 * (frame.age - 55)
    frame["outcome"] = np.where(rng.random(records) < 1 / (1 + np.exp(-linear)), "yes", "no")
    frame.to_csv(folder / "records.csv", index=False)
    (folder / "plan.toml").write_text(PLAN, encoding="utf-8")
    return folder / "plan.toml"


def plain_fit(path: Path) -> float:
    """Read, build the matrix, fit, Wald intervals: nothing else."""
    start = time.perf_counter()
    frame = pd.read_csv(path)
    X = np.asarray(patsy.dmatrix(FORMULA, frame))
    fit = sm.Logit((frame.outcome == "yes").to_numpy(float), X).fit(disp=0)
    np.exp(fit.conf_int())
    return time.perf_counter() - start


def main() -> None:
    sizes = [int(size) for size in sys.argv[1:]] or [4_000, 100_000]
    for records in sizes:
        with tempfile.TemporaryDirectory() as name:
            plan = write_records(Path(name), records)
            theirs = plain_fit(plan.parent / "records.csv")
            start = time.perf_counter()
            run_plan(plan)
            ours = time.perf_counter() - start
            print(
                f"{records:>9,} records: report with profile limits and checks {ours:6.2f} s; "
                f"plain fit by pandas + patsy + statsmodels {theirs:6.2f} s; ratio {ours / theirs:.2f}"
            )


if __name__ == "__main__":
    main()
