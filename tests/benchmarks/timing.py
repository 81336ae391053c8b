"""Times measured side by side, so that what else the machine does falls on all alike."""

from __future__ import annotations

import os
import statistics
import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

SLOW = 20.0
"""Work that takes longer, in seconds, is done once."""


@dataclass(frozen=True)
class Timed:
    """Median time in seconds of several runs, how many, and the last answer."""

    seconds: float
    runs: int
    answer: Any


def side_by_side(works: Mapping[str, Callable[[], Any]], runs: int) -> dict[str, Timed]:
    """Each piece of work in turn, and again, `runs` times; one run before all others where there are several."""
    times: dict[str, list[float]] = {name: [] for name in works}
    answers: dict[str, Any] = {}
    for run in range(runs + (runs > 1)):
        for name, work in works.items():
            if times[name] and times[name][0] > SLOW:
                continue
            start = time.perf_counter()
            answers[name] = work()
            times[name].append(time.perf_counter() - start)
            if run == 1 and times[name][0] <= SLOW:
                del times[name][0]
    return {name: Timed(statistics.median(seconds), len(seconds), answers[name]) for name, seconds in times.items()}


def machine() -> str:
    """The cores and how busy they are with other things, in words."""
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count()
    busy = os.getloadavg()[0] if hasattr(os, "getloadavg") else float("nan")
    warning = "" if busy < 0.5 else " THE MACHINE IS BUSY: ratios are not to be trusted."
    return f"{cores} cores; about {busy:.1f} of them busy with other work at the start.{warning}"
