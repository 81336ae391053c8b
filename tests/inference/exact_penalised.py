"""Penalised likelihoods written out and maximised in 50-digit arithmetic, and by scipy, for the tests only."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import mpmath
import numpy as np
from scipy.optimize import brentq, minimize

DIGITS = 60
STEP = mpmath.mpf(10) ** -18
"""Differences across so much give derivatives to some 36 digits."""


def jeffreys(X: Any, events: Any, trials: Any, offset: Any = None) -> Callable[[Any], Any]:
    """l(beta) + log|X'WX| / 2 at a list of mpmath numbers."""
    rows = [[mpmath.mpf(float(x)) for x in row] for row in X]
    y, n = [mpmath.mpf(float(e)) for e in events], [mpmath.mpf(float(t)) for t in trials]
    extra = [mpmath.mpf(0)] * len(rows) if offset is None else [mpmath.mpf(float(o)) for o in offset]
    p = len(rows[0])

    def value(beta: Any) -> Any:
        total, information = mpmath.mpf(0), mpmath.zeros(p, p)
        for i, row in enumerate(rows):
            linear = extra[i] + mpmath.fsum(row[j] * beta[j] for j in range(p))
            total += y[i] * linear - n[i] * mpmath.log(1 + mpmath.exp(linear))
            risk = 1 / (1 + mpmath.exp(-linear))
            for j in range(p):
                for k in range(p):
                    information[j, k] += n[i] * risk * (1 - risk) * row[j] * row[k]
        return total + mpmath.log(mpmath.det(information)) / 2

    return value


def gradient(value: Callable[[Any], Any], beta: Any) -> Any:
    """Central differences of a value."""
    found = []
    for j in range(len(beta)):
        up, down = list(beta), list(beta)
        up[j] += STEP
        down[j] -= STEP
        found.append((value(up) - value(down)) / (2 * STEP))
    return found


def _solved(equations: Callable[[Any], Any], start: Any) -> Any:
    """A root of as many equations as unknowns by Newton's method from a start nearby."""
    point = [mpmath.mpf(float(b)) for b in start]
    p = len(point)
    for _ in range(40):
        now = equations(point)
        jacobian = mpmath.zeros(p, p)
        for j in range(p):
            moved = list(point)
            moved[j] += mpmath.mpf(10) ** -12
            after = equations(moved)
            for k in range(p):
                jacobian[k, j] = (after[k] - now[k]) * mpmath.mpf(10) ** 12
        step = mpmath.lu_solve(jacobian, -mpmath.matrix(now))
        point = [one + change for one, change in zip(point, step, strict=True)]
        if mpmath.norm(step) < mpmath.mpf(10) ** -25:
            return point
    raise ArithmeticError("no root near the start")


def exact_maximum(value: Callable[[Any], Any], start: Any) -> Any:
    """The stationary point next to a start, in mpmath numbers."""
    with mpmath.workdps(DIGITS):
        return _solved(lambda beta: gradient(value, beta), start)


def exact_profile_limit(value: Callable[[Any], Any], height: Any, j: int, start: Any) -> Any:
    """The coefficient j at which the value is `height` and its other derivatives are zero, next to a start."""
    with mpmath.workdps(DIGITS):

        def equations(beta: Any) -> Any:
            slopes = gradient(value, beta)
            slopes[j] = value(beta) - height
            return slopes

        return _solved(equations, start)[j]


def by_scipy(loss: Callable[[np.ndarray], float], start: np.ndarray) -> Any:
    """A minimum by quasi-Newton steps with differences, polished by a simplex."""
    rough = minimize(loss, start, method="BFGS", options={"gtol": 1e-8})
    return minimize(loss, rough.x, method="Nelder-Mead", options={"xatol": 1e-9, "fatol": 1e-13, "maxiter": 4000})


def limits_by_scipy(
    loss: Callable[[np.ndarray], float], best: Any, j: int, quantile: float, reach: float
) -> tuple[float, float]:
    """Profile limits of coefficient j by refits at fixed values, found between the minimum and `reach` away from it."""

    def above(theta: float) -> float:
        others = np.delete(best.x, j)
        if others.size == 0:
            return quantile / 2 - (loss(np.array([theta])) - best.fun)
        refit = by_scipy(lambda rest: loss(np.insert(rest, j, theta)), others)
        return quantile / 2 - (refit.fun - best.fun)

    centre = best.x[j]
    return (
        float(brentq(above, centre - reach, centre, xtol=1e-7)),
        float(brentq(above, centre, centre + reach, xtol=1e-7)),
    )
