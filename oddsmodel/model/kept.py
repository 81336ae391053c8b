"""Records that measures count: whole, or counted by the values of the columns that are asked for."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class KeptRecords:
    """Records, or groups of equal ones.

    frame: coded columns (n rows); event (n,): whether the event happened; counts (n,): true frequencies, or None.
    """

    frame: pd.DataFrame
    event: NDArray[np.bool_]
    counts: Array | None = None

    def of(self, *names: str) -> KeptRecords:
        """These records: they are in memory, and hold the columns."""
        return self


class People(Protocol):
    """Records wherever they are."""

    def of(self, *names: str) -> KeptRecords:
        """The records counted by the values of these columns and by outcome.

        Where numbers among them have too many different values to be held, they are rounded to 12 binary digits.
        """
