"""The count column of grouped records: how many equal records a row stands for."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.errors import Fault
from oddsmodel.records.faults import fault

ROWS_NAMED = 5
LARGEST_TOTAL = 2.0**53


def faults_of_counts(counts: NDArray[np.float64], *, where: str, first_row: int) -> list[Fault]:
    """The faults of a count column (n,): a count not recorded, below 0 or not whole; no records; more than 2^53."""
    with np.errstate(invalid="ignore"):
        wrong = ~(np.isfinite(counts) & (counts >= 0) & (counts == np.trunc(counts)))
    if wrong.any():
        rows = [int(row) + first_row for row in np.flatnonzero(wrong)[:ROWS_NAMED]]
        return [fault("count-not-whole", where, rows=rows, total=int(wrong.sum()))]
    total = float(counts.sum())
    if total == 0:
        return [fault("count-of-none", where)]
    return [fault("count-too-large", where)] if total > LARGEST_TOTAL else []
