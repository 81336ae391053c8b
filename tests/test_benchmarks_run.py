"""The benchmarks run, on few records."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

BENCHMARKS = Path(__file__).parent / "benchmarks"


@pytest.mark.parametrize(("name", "told"), [("engine.py", "5, all categories"), ("costs.py", "Passes over all rows")])
def test_quick_benchmarks(name: str, told: str) -> None:
    ran = subprocess.run([sys.executable, BENCHMARKS / name, "--quick"], capture_output=True, text=True, check=False)
    assert ran.returncode == 0, ran.stderr
    assert told in ran.stdout
