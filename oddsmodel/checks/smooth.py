"""A smooth curve of the observed share against the fitted probability."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.probability_groups import group_starts

Array = NDArray[np.float64]

SPAN = 0.75
"""Share of the records that a point of the curve looks at, as in Austin & Steyerberg 2014."""

POINTS = 60
TAIL = 0.01
"""Share of the records at either end where no curve is drawn: there it would follow a handful of records."""

MOST_BINS = 2000
FEWEST_VALUES = 10
FEWEST_RECORDS = 50


def smooth_share(probability: Array, records: Array, events: Array) -> tuple[tuple[float, float], ...]:
    """Points (fitted probability, smoothed observed share); none where there are under 10 values or 50 records.

    probability (j,) rising, with records and events (j,) at each. Local straight lines with tricube weights over
    the nearest three quarters of the records (Cleveland 1979, Journal of the American Statistical Association
    74:829-836, without the robust steps, which make no sense for a binary outcome), cut off at 0 and 1. More than
    2,000 values are first put into 2,000 bins of about equal numbers of records.
    """
    if too_few(probability, records):
        return ()
    if probability.size > MOST_BINS:
        starts = group_starts(records, MOST_BINS)
        expected, records, events = (
            np.add.reduceat(values, starts) for values in (probability * records, records, events)
        )
        probability = expected / records
    grid = drawn_at(probability, records)
    fitted = local_lines(grid, probability, records) @ (events / records)
    return tuple(zip(grid.tolist(), np.clip(fitted, 0.0, 1.0).tolist(), strict=True))


def too_few(probability: Array, records: Array) -> bool:
    """Whether there are too few different probabilities (j,), or records (j,) at them, for a smooth curve."""
    return probability.size < FEWEST_VALUES or float(records.sum()) < FEWEST_RECORDS


def drawn_at(probability: Array, records: Array) -> Array:
    """Where the curve is drawn (g,), for records (j,) at rising probabilities; nowhere where nearly all are equal."""
    total = float(records.sum())
    first, last = np.searchsorted(np.cumsum(records), [TAIL * total, (1.0 - TAIL) * total])
    low, high = float(probability[first]), float(probability[min(last, probability.size - 1)])
    return np.linspace(low, high, POINTS) if high > low else np.empty(0)


def local_lines(grid: Array, x: Array, weight: Array) -> Array:
    """What each y at x (j,) counts (g, j) for the value at a grid point (g,) of a straight line through the nearest
    records, of which `weight` (j,) are at each x."""
    offset = x[None, :] - grid[:, None]
    distance = np.abs(offset)
    order = np.argsort(distance, axis=1, kind="stable")
    near = np.take_along_axis(distance, order, axis=1)
    reached = np.cumsum(weight[order], axis=1)
    edge = np.argmax(reached >= SPAN * reached[:, -1:] * (1.0 - 1e-12), axis=1)
    width = near[np.arange(grid.size), edge][:, None]
    # A heap of records at one value can fill the whole span: the line then reaches to everything.
    width = np.where(width > 0.0, width, near[:, -1:]) * (1.0 + 1e-9)
    tricube = weight * np.clip(1.0 - (distance / width) ** 3, 0.0, 1.0) ** 3
    s0 = tricube.sum(axis=1)
    centre = (tricube * offset).sum(axis=1) / s0
    apart = offset - centre[:, None]
    spread = (tricube * apart**2).sum(axis=1)
    # No slope where the records near a point are nearly at one value.
    pull = np.divide(centre, spread, out=np.zeros_like(s0), where=spread > 1e-12 * s0 * width[:, 0] ** 2)
    return np.asarray(tricube * (1.0 / s0[:, None] - pull[:, None] * apart))
