"""Coded records as plain arrays: what a pass over rows on disk or on a worker has in place of a frame."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True)
class CodedRows:
    """Consecutive records, `first` of them before.

    arrays: for each record column its numbers (n,), or the places (n,) of its levels, below 0 where not recorded.
    levels: those of every column that has them, in order; a column without is one of numbers.
    """

    arrays: Mapping[str, NDArray[Any]]
    levels: Mapping[str, tuple[str, ...]]
    first: int = 0

    def __len__(self) -> int:
        return int(next(iter(self.arrays.values())).shape[0]) if self.arrays else 0
