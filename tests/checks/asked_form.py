"""References for the asked-for checks of form, by statsmodels and by plain formulas."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd
import statsmodels.api as sm

POWERS = (-2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 2.0, 3.0)
PAIRS = tuple(itertools.combinations_with_replacement(POWERS, 2))


def power(x: np.ndarray, p: float) -> np.ndarray:
    return np.log(x) if p == 0 else x**p


def functions(x: np.ndarray, powers: Sequence[float]) -> np.ndarray:
    """H_1 and H_2 of Royston & Altman 1994: a power used twice is multiplied by the log."""
    if len(powers) == 1:
        return power(x, powers[0])[:, None]
    first, second = powers
    return np.column_stack([power(x, first), power(x, first) * np.log(x) if first == second else power(x, second)])


def log_likelihood(y: Any, X: Any) -> float:
    """The maximum by statsmodels, the columns standardised so that its steps are safe."""
    columns = np.asarray(X, dtype=float)
    spread = columns.std(axis=0)
    centre = columns.mean(axis=0) if (spread == 0).any() else 0.0
    moved = np.where(spread > 0, (columns - centre) / np.where(spread > 0, spread, 1), columns)
    return float(sm.Logit(np.asarray(y, dtype=float), moved).fit(disp=0, tol=1e-12, maxiter=200).llf)


def columns_of(model: Any, frame: pd.DataFrame) -> np.ndarray:
    return np.asarray(model.design.encode(frame))
