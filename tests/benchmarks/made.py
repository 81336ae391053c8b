"""Invented records for the benchmarks."""

from __future__ import annotations

from typing import Literal

import numpy as np

Kind = Literal["all numbers", "mixed", "all categories"]
KINDS: tuple[Kind, ...] = ("all numbers", "mixed", "all categories")

SHARES = (0.4, 0.3, 0.2, 0.1)
"""How common the levels of a factor are; the first is the reference."""


def records(kind: Kind, number: int, columns: int) -> tuple[np.ndarray, np.ndarray]:
    """X (number, columns) with an intercept, and outcomes (number,) of which about a quarter are events.

    Numbers are standard normal, and half of the columns of mixed data. The others are indicators of factors of four
    levels.
    """
    rng = np.random.default_rng(columns)
    numbers = {"all numbers": columns - 1, "mixed": (columns - 1) // 2, "all categories": 0}[kind]
    X = np.zeros((number, columns))
    X[:, 0] = 1.0
    for column in range(1, 1 + numbers):
        X[:, column] = rng.normal(size=number)
    for column in range(1 + numbers, columns, len(SHARES) - 1):
        levels = rng.choice(len(SHARES), number, p=SHARES)
        for level in range(1, min(len(SHARES), columns - column + 1)):
            X[:, column + level - 1] = levels == level
    beta = rng.normal(size=columns) * 0.8 / np.sqrt(columns)
    beta[0] = -1.2
    return X, (rng.random(number) < 1 / (1 + np.exp(-X @ beta))).astype(float)
