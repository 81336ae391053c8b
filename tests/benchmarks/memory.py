"""Peak memory of a fit, its profile limits and its certificate beyond the model matrix, as multiples of 8 n p bytes.

Run: python tests/benchmarks/memory.py [--quick]     (Linux; each size in a process of its own)
"""

from __future__ import annotations

import argparse
import subprocess
import sys
from collections.abc import Sequence
from pathlib import Path

from made import records

from oddsmodel.inference import certify, maximise, profile_intervals
from oddsmodel.likelihood import BinomialLikelihood


def resident(field: str) -> int:
    """Bytes now resident (VmRSS) or the most since the last reset (VmHWM)."""
    for line in Path("/proc/self/status").read_text().splitlines():
        if line.startswith(field + ":"):
            return int(line.split()[1]) * 1024
    raise RuntimeError(f"{field} is not told by this system")


def alone(number: int, columns: int) -> None:
    """The measurement, in this process."""
    maximise(BinomialLikelihood(*records("mixed", 1_000, columns)))
    X, y = records("mixed", number, columns)
    before = resident("VmRSS")
    steps = []
    fit = None
    for step in ("fit", "limits", "certificate"):
        Path("/proc/self/clear_refs").write_text("5")
        if step == "fit" or fit is None:
            fit = maximise(BinomialLikelihood(X, y))
        elif step == "limits":
            profile_intervals(fit)
        else:
            certify(fit)
        steps.append(f"{(resident('VmHWM') - before) / X.nbytes:14.3f}")
    print(f"{number:>12,}{columns:>9}{X.nbytes / 1e6:>14.0f}" + "".join(steps))


def main(arguments: Sequence[str] | None = None) -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--quick", action="store_true")
    parser.add_argument("--alone", type=int, nargs=2)
    asked = parser.parse_args(arguments)
    if asked.alone:
        alone(*asked.alone)
        return
    print("Memory beyond the model matrix, as multiples of its 8 n p bytes")
    print(f"{'records':>12}{'columns':>9}{'matrix, MB':>14}{'fit':>14}{'limits':>14}{'certificate':>14}", flush=True)
    for size in ((20_000, 17),) if asked.quick else ((100_000, 17), (1_000_000, 17), (1_000_000, 60), (4_000_000, 17)):
        subprocess.run([sys.executable, __file__, "--alone", *map(str, size)], check=True)


if __name__ == "__main__":
    main()
