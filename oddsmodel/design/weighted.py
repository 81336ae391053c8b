"""Means, deviations and quantiles of values that stand for several equal records each."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]


def weighted_mean(x: Array, counts: Array | None = None) -> float:
    """Mean of x (n,), each value counted counts (n,) times."""
    return float(np.mean(x) if counts is None else np.average(x, weights=counts))


def weighted_deviation(x: Array, counts: Array | None = None, *, lost: int) -> float:
    """Standard deviation of x (n,), each value counted counts (n,) times; the sum of squares is divided by the number
    of records less `lost`. Nothing but rounding, told from the size of the values, is 0, and so is a single record.
    """
    number = float(x.size if counts is None else counts.sum())
    if number <= lost:
        return 0.0
    about = (x - weighted_mean(x, counts)) ** 2
    squares = float(about.sum() if counts is None else about @ counts)
    deviation = float(np.sqrt(squares / (number - lost)))
    return deviation if deviation > 1e-14 * float(np.abs(x).max(initial=0.0)) else 0.0


def weighted_quantiles(x: Array, shares: ArrayLike, counts: Array | None = None) -> Array:
    """Quantiles of x (n,) at the shares (q,), each value counted counts (n,) times, linear between neighbours
    (Hyndman & Fan 1996, definition 7): those of the values written out as often as they count.
    """
    wanted = np.asarray(shares, dtype=np.float64)
    if counts is None:
        return np.asarray(np.quantile(x, wanted), dtype=np.float64)
    used = counts > 0
    order = np.argsort(x[used], kind="stable")
    values, ends = x[used][order], np.cumsum(counts[used][order])
    place = (ends[-1] - 1.0) * wanted
    below = np.floor(place)
    lower = values[np.searchsorted(ends, below, side="right")]
    upper = values[np.minimum(np.searchsorted(ends, np.ceil(place), side="right"), values.size - 1)]
    return np.asarray(lower + (place - below) * (upper - lower))
