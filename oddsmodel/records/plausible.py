"""Numbers outside the range that the plan calls plausible become "not recorded"."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from oddsmodel.findings import Finding
from oddsmodel.wording import finding


def within_plausible(
    numbers: NDArray[np.float64], plausible: Sequence[float] | None
) -> tuple[NDArray[np.float64], NDArray[np.bool_] | None]:
    """The numbers (n,) with NaN for those below the first or above the second limit, and the mask (n,) of these.

    The limits themselves are plausible. The mask is None where no number is set aside.
    """
    if plausible is None:
        return numbers, None
    outside = (numbers < plausible[0]) | (numbers > plausible[1])
    return (np.where(outside, np.nan, numbers), outside) if outside.any() else (numbers, None)


def implausible_finding(column: str, records: int, plausible: Sequence[float]) -> Finding:
    """How many records have a value that was set aside."""
    limits = [float(limit) for limit in plausible]
    return finding("note", "implausible-values", column=column, limits=limits, records=records)
