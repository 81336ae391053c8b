"""Complete and quasi-complete separation, decided by linear programming on the rows."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array

Direction = Literal["finite", "plus infinity", "minus infinity", "undetermined"]

TOLERANCE = 1e-7


@dataclass(frozen=True)
class Separation:
    """Whether some direction raises the log-likelihood without end, and what it does to each coefficient.

    separated: whether there is such a direction. complete: whether it separates every row. direction (p,): one
    such direction (zeros where there is none). rows (n,): the rows separated by it. coefficients: for each, whether
    its maximum-likelihood value is finite, plus or minus infinity, or of undetermined direction.
    """

    separated: bool
    complete: bool
    direction: Array
    rows: NDArray[np.bool_]
    coefficients: tuple[Direction, ...]


def separation(X: Array, events: Array, trials: Array) -> Separation:
    """Decide separation of rows X (n, p) with events out of trials (n,).

    The log-likelihood has no finite maximum if and only if a direction v has x'v >= 0 on every row with events
    only, x'v <= 0 on every row with none, x'v = 0 on mixed rows, and is not zero on all rows (Albert & Anderson
    1984, Biometrika 71:1-10; Santner & Duffy 1986). Such v is sought by maximising the sum of |x'v| over the
    unmixed rows within -1 <= v <= 1 of the scaled columns (Konis 2007), repeatedly on the rows not yet
    separated until nothing more is; each coefficient's sign over the whole cone is then found by the largest
    and the smallest value it takes. Columns are scaled to largest absolute value one. X must have full rank.
    """
    n, p = X.shape
    scale = np.abs(X).max(axis=0)
    scale[scale == 0] = 1.0
    counted = trials > 0
    sign = np.where(events >= trials, 1.0, -1.0)
    sign[(events > 0) & (events < trials)] = 0.0
    rows = np.unique(np.column_stack([sign, X / scale])[counted], axis=0)
    signs, scaled = rows[:, 0], rows[:, 1:]
    one_sided = signs[:, None] * scaled
    unmixed, mixed = one_sided[signs != 0], scaled[signs == 0]

    direction = np.zeros(p)
    remaining = np.ones(unmixed.shape[0], dtype=bool)
    while remaining.any():
        found = _extreme(unmixed[remaining].sum(axis=0), unmixed, mixed)
        gained = (unmixed @ found > TOLERANCE) & remaining
        if not gained.any():
            break
        direction += found
        remaining &= ~gained
    separated = bool((~remaining).any())
    if not separated:
        return Separation(False, False, np.zeros(p), np.zeros(n, dtype=bool), ("finite",) * p)
    kinds: list[Direction] = []
    for j in range(p):
        unit = np.eye(p)[j]
        most = float(unit @ _extreme(unit, unmixed, mixed))
        least = float(unit @ _extreme(-unit, unmixed, mixed))
        if most <= TOLERANCE and least >= -TOLERANCE:
            kinds.append("finite")
        elif least >= -TOLERANCE:
            kinds.append("plus infinity")
        elif most <= TOLERANCE:
            kinds.append("minus infinity")
        else:
            kinds.append("undetermined")
    apart = (np.abs((X / scale) @ direction) > TOLERANCE) & counted
    return Separation(True, bool(not remaining.any() and not mixed.size), direction / scale, apart, tuple(kinds))


def _extreme(objective: Array, unmixed: Array, mixed: Array) -> Array:
    """The v in -1..1 with unmixed v >= 0 and mixed v = 0 that makes objective'v largest."""
    from scipy.optimize import linprog

    p = objective.size
    size = float(np.abs(objective).max())
    if size == 0.0:
        return np.zeros(p)
    solved = linprog(
        -objective / size,
        A_ub=-unmixed if unmixed.size else None,
        b_ub=np.zeros(unmixed.shape[0]) if unmixed.size else None,
        A_eq=mixed if mixed.size else None,
        b_eq=np.zeros(mixed.shape[0]) if mixed.size else None,
        bounds=(-1.0, 1.0),
        method="highs",
    )
    return np.asarray(solved.x) if solved.status == 0 else np.zeros(p)
