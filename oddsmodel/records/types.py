"""What the records floor hands over: a frame of float64, bool and category columns, and what each column is."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import pandas as pd

from oddsmodel.findings import Finding


@dataclass(frozen=True, slots=True)
class Column:
    """What is known of one column.

    levels: for category, ordered and yes-no the levels in order; the reference is one of them.
    per: the odds ratio's unit for a number (1.0 unless the plan says otherwise; "SD" is resolved to the
        standard deviation on the main model's records when a model is built).
    """

    name: str
    kind: str
    label: str
    units: str | None = None
    levels: tuple[str, ...] = ()
    reference: str | None = None
    per: float | str = 1.0
    timing: str = "unknown"
    why: str = ""
    other_levels: str = "stop"


@dataclass(frozen=True, slots=True)
class Records:
    """Coded records, one row a record (or a group of `count` equal records).

    frame: number columns float64 (NaN: not recorded); category, ordered and yes-no columns pandas categoricals
        with exactly the levels of the plan (NaN: not recorded, or a level not in the plan); identifiers and
        dates as categoricals of their text.
    outside_levels: per column the mask (n,) of rows whose level is not in the plan, where any is.
    counts: (n,) float64 true frequencies, or None.
    read: records read (the sum of counts where there are any).
    """

    frame: pd.DataFrame
    columns: Mapping[str, Column]
    read: int
    source: str
    sha256: str
    findings: tuple[Finding, ...] = ()
    counts: pd.Series | None = None
    outside_levels: Mapping[str, pd.Series] = field(default_factory=dict)
