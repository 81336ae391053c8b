"""A table as it was read: numbers as float64, texts as categoricals, before the plan gives them a meaning."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

import pandas as pd

from oddsmodel.findings import Finding

RawType = Literal["number", "text", "yes-no", "date", "category", "ordered", "empty"]


@dataclass(frozen=True, slots=True)
class RawColumn:
    """One column as read.

    values: float64 for a number or an empty column, otherwise a categorical of texts without spaces around them.
    type: what the file says of it; "category" and "ordered" only where the categories' order was given with it.
    stripped, cleaned: records in which spaces around a text, or characters that cannot be shown, were removed.
    """

    values: pd.Series
    type: RawType
    stripped: int = 0
    cleaned: int = 0


@dataclass(frozen=True, slots=True)
class RawTable:
    """A table as it was read, one row a record.

    frame: float64 columns (NaN: an empty cell) and categoricals of texts. types: by column.
    refused: columns that were left out, with what they hold ("lists", "bytes").
    first_row: what the first record's row is called (2 where row 1 holds the names).
    """

    frame: pd.DataFrame
    types: Mapping[str, RawType]
    source: str
    sha256: str
    findings: tuple[Finding, ...] = ()
    refused: Mapping[str, str] = field(default_factory=dict)
    first_row: int = 2
