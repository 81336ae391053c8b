"""What the records floor hands over: a frame of float64, bool and category columns, and what each column is."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.findings import Finding
from oddsmodel.results.derived import DerivedColumn


@dataclass(frozen=True, slots=True)
class Column:
    """What is known of one column.

    levels: for category, ordered and yes-no the levels in order; the reference is one of them.
    per: the odds ratio's unit for a number (1.0 unless the plan says otherwise; "SD" is resolved to the
        standard deviation on the main model's records when a model is built).
    deviation: that standard deviation, once it is known; None leaves it to the records of each design.
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
    deviation: float | None = None


@dataclass(frozen=True, slots=True)
class LeftOut:
    """Rows (n,) that no model of the plan uses, under one reason; facts: what the reason's sentence needs."""

    rows: NDArray[np.bool_]
    facts: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Records:
    """Coded records, one row a record (or a group of `count` equal records).

    frame: number columns float64 (NaN: not recorded); category, ordered and yes-no columns pandas categoricals
        with exactly the levels of the plan (NaN: not recorded, or a level not in the plan); identifiers and
        dates as categoricals of their text.
    outside_levels: per column the mask (n,) of rows whose level is not in the plan, where any is.
    counts: (n,) float64 true frequencies, or None.
    read: records read (the sum of counts where there are any).
    left_out: what the plan leaves out of every model, by the code of its reason (`accounting.REASONS` orders them).
    derived: how the derived columns were made.
    """

    frame: pd.DataFrame
    columns: Mapping[str, Column]
    read: int
    source: str
    sha256: str
    findings: tuple[Finding, ...] = ()
    counts: pd.Series | None = None
    outside_levels: Mapping[str, pd.Series] = field(default_factory=dict)
    left_out: Mapping[str, LeftOut] = field(default_factory=dict)
    derived: tuple[DerivedColumn, ...] = ()
