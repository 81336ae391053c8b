"""One linear program over a cone of directions, solved by HiGHS."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.likelihood.base import Array

TOLERANCE = 1e-10
"""The least that HiGHS allows for a constraint not met."""


@dataclass(frozen=True)
class Extreme:
    """The point (p,), its value, and the weights (m,) of the rows and (e,) of the equal ones in the proof that no
    point does better."""

    point: Array
    value: float
    weights: Array
    equal_weights: Array


def extreme(objective: Array, rows: Array, equal: Array) -> Extreme | None:
    """The v in -1..1 with rows v >= 0 and equal v = 0 that makes objective'v largest (Konis 2007).

    objective (p,), rows (m, p) and equal (e, p) are best of size about one. The weights y >= 0 and z are those of
    the dual: objective + y'rows + z'equal = 0 where the best is zero. None where HiGHS gives
    up or a number is not finite.
    """
    from scipy.optimize import linprog

    p = objective.size
    if not all(np.isfinite(part).all() for part in (objective, rows, equal)):
        return None
    for presolve in (True, False):
        solved = linprog(
            -objective,
            A_ub=-rows if rows.shape[0] else None,
            b_ub=np.zeros(rows.shape[0]) if rows.shape[0] else None,
            A_eq=equal if equal.shape[0] else None,
            b_eq=np.zeros(equal.shape[0]) if equal.shape[0] else None,
            bounds=(-1.0, 1.0),
            method="highs",
            options={
                "presolve": presolve,
                "primal_feasibility_tolerance": TOLERANCE,
                "dual_feasibility_tolerance": TOLERANCE,
            },
        )
        if solved.status == 0 and solved.x is not None:
            weights = np.maximum(-np.asarray(solved.ineqlin.marginals), 0.0) if rows.shape[0] else np.zeros(0)
            equal_weights = np.asarray(solved.eqlin.marginals) if equal.shape[0] else np.zeros(0)
            point = np.asarray(solved.x, dtype=np.float64).reshape(p)
            return Extreme(point, float(objective @ point), weights, equal_weights)
    return None
