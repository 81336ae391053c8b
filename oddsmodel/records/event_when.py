"""An outcome from a condition on other columns, decided in three values."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.records.condition import vet_condition
from oddsmodel.records.types import Column

Mask = NDArray[np.bool_]
WHERE = "the plan, [outcome] event_when"


def event_when(
    text: str, frame: pd.DataFrame, columns: Mapping[str, Column], outside: Mapping[str, pd.Series]
) -> tuple[Mask, Mask]:
    """Where the event happened (n,), and where it is decided whether it did (n,).

    Parts that are not recorded are undecided (Kleene 1952, section 64): `a or b` holds where one part does, whatever
    the other, and fails only where both are recorded and fail; `a and b` fails where one part does. Where the whole is
    undecided, the outcome is not recorded.

    outside: see `Records.outside_levels`. Raises: InputFault for a condition that does not fit the columns.
    """
    return vet_condition(text, columns, WHERE).evaluate(frame, outside)
