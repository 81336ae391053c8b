"""Files larger than memory: time and peak memory of a whole run, by the number of records.

Run: python tests/benchmarks/large_file.py [records ...] [--memory "2 GB"] [--keep FOLDER]
     (ten, thirty and a hundred million records by default: about an hour, and 8 GB of disk)
"""

from __future__ import annotations

import argparse
import json
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

PLAN = """
[study]
title = "Benchmark"
question = "Is the exposure associated with the outcome?"
design = "cohort"
[records]
source = "records.parquet"
[outcome]
column = "outcome"
event = "yes"
[columns.exposure]
kind = "category"
levels = ["none", "some", "much"]
reference = "none"
[[models]]
name = "main"
formula = "outcome ~ exposure + region + ward + sex + age + weight + pressure + score + stays"
exposures = ["exposure"]
[run]
memory = "{memory}"
"""
AT_ONCE = 1_000_000


def write(folder: Path, records: int, memory: str) -> Path:
    """Ten columns: the outcome, four categories, five numbers, one of which has a value of its own in most records."""
    rng = np.random.default_rng(7)
    path = folder / "records.parquet"
    writer = None
    for start in range(0, records, AT_ONCE):
        n = min(AT_ONCE, records - start)
        exposure = rng.choice(3, n, p=[0.5, 0.3, 0.2])
        age = rng.integers(18, 95, n).astype(float)
        linear = -2.2 + np.array([0.0, 0.3, 0.6])[exposure] + 0.02 * (age - 55)
        named = {
            "exposure": (exposure, ["none", "some", "much"]),
            "region": (rng.integers(0, 6, n), [f"region {i}" for i in range(6)]),
            "ward": (rng.integers(0, 3, n), ["medical", "other", "surgical"]),
            "sex": (rng.integers(0, 2, n), ["female", "male"]),
            "outcome": ((rng.random(n) < 1 / (1 + np.exp(-linear))).astype(int), ["no", "yes"]),
        }
        columns = {
            name: pa.DictionaryArray.from_arrays(pa.array(codes.astype(np.int8)), pa.array(levels))
            for name, (codes, levels) in named.items()
        }
        columns |= {
            "age": pa.array(age),
            "weight": pa.array(np.round(rng.normal(75, 14, n), 1)),
            "pressure": pa.array(np.round(rng.normal(130, 18, n))),
            "score": pa.array(rng.normal(size=n)),
            "stays": pa.array(rng.poisson(1.2, n).astype(float)),
        }
        table = pa.table(columns)
        writer = writer or pq.ParquetWriter(path, table.schema)
        writer.write_table(table, row_group_size=262_144)
    if writer is not None:
        writer.close()
    (folder / "plan.toml").write_text(PLAN.format(memory=memory), encoding="utf-8")
    return folder / "plan.toml"


def run(plan: Path) -> tuple[float, float]:
    """Seconds of the command, and its peak resident memory in GB."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss
    start = time.perf_counter()
    command = [
        str(Path(sys.executable).with_name("oddsmodel")),
        "run",
        str(plan),
        "--into",
        str(plan.parent / "report"),
    ]
    subprocess.run(command, check=True, capture_output=True)
    peak = resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss
    if peak <= before:
        raise RuntimeError("the peak of an earlier run hides this one's: run each size in a process of its own")
    return time.perf_counter() - start, peak * 1024 / 1e9


def main() -> None:
    parser = argparse.ArgumentParser()
    parser.add_argument("records", nargs="*", type=int)
    parser.add_argument("--memory", default="2 GB")
    parser.add_argument("--keep", type=Path)
    options = parser.parse_args()
    for records in options.records or [10_000_000, 30_000_000, 100_000_000]:
        if len(options.records) == 1:
            with tempfile.TemporaryDirectory() as name:
                folder = options.keep or Path(name)
                folder.mkdir(exist_ok=True)
                plan = write(folder, records, options.memory)
                seconds, peak = run(plan)
                model = json.loads((folder / "report/results.json").read_text(encoding="utf-8"))["models"][0]
                size = (folder / "records.parquet").stat().st_size / 1e9
                print(
                    f"{records:>12,} records ({size:.2f} GB): {seconds:7.1f} s, {1e6 * seconds / records:.2f} s a "
                    f"million, peak {peak:.2f} GB, {model['parameters']} coefficients",
                    flush=True,
                )
        else:
            subprocess.run([sys.executable, __file__, str(records), "--memory", options.memory], check=True)


if __name__ == "__main__":
    main()
