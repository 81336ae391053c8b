"""The logistic function in parts that neither overflow nor cancel."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray


def logistic(linear: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any], NDArray[Any]]:
    """exp(-|linear|), one plus it, and the risk 1 / (1 + exp(-linear)).

    All in the precision of `linear`, any shape. The variance of one outcome is the first over the square of the second.
    """
    small = np.exp(-np.abs(linear))
    whole = 1.0 + small
    return small, whole, np.maximum(small, linear >= 0.0) / whole
