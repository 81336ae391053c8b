"""The count column of grouped records: how many equal records a row stands for."""

from __future__ import annotations

import numpy as np

from oddsmodel.errors import Fault
from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.faults import fault
from oddsmodel.records.rows import Rows

LARGEST_TOTAL = 2.0**53


def faults_of_counts(column: CodedColumn, *, where: str, rows: Rows) -> list[Fault]:
    """The faults of a count column (n,): no numbers; a count not recorded, below 0 or not whole; no records; more than
    2^53 of them."""
    if column.column.kind != "number":
        return [fault("count-not-number", where)]
    counts = column.values.to_numpy(np.float64)
    with np.errstate(invalid="ignore"):
        wrong = ~(np.isfinite(counts) & (counts >= 0) & (counts == np.trunc(counts)))
    if wrong.any():
        at = np.flatnonzero(wrong)
        return [fault("count-not-whole", where, rows=rows.first(at)[0], total=rows.total(at))]
    total = float(counts.sum() if rows.weights is None else counts @ rows.weights)
    if total == 0:
        return [fault("count-of-none", where)]
    return [fault("count-too-large", where)] if total > LARGEST_TOTAL else []
