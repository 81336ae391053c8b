"""A curve of precision against recall on a grid so wide that no small count can be worked out from it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from oddsmodel.results.figures import PrecisionFigure

MOST_STEPS = 20
ROUNDING = 50
"""Precision is rounded to a fiftieth."""


def coarsen_precision(figure: PrecisionFigure, threshold: int, events: int, others: int) -> PrecisionFigure | None:
    """The curve on an even grid of recall of at most 20 points, its heights rounded to 0.02.

    A step of the grid holds at least `threshold` events; only points at which at least as many records without the
    event lie above the cut, and as many or none below it, are kept. None where fewer than two are.
    """
    steps = min(MOST_STEPS, events // threshold)
    if steps < 2 or not figure.points:
        return None
    recall, precision = np.array(figure.points).T
    grid = np.arange(1, steps + 1) / steps
    heights = precision[np.minimum(np.searchsorted(recall, grid - 1e-9), recall.size - 1)]
    above = grid * events * (1.0 / heights - 1.0)
    below = others - above
    kept = (above >= threshold) & ((below >= threshold) | (below < 0.5))
    if int(kept.sum()) < 2:
        return None
    rounded = np.rint(heights[kept] * ROUNDING) / ROUNDING
    return replace(figure, points=tuple(zip(grid[kept].tolist(), rounded.tolist(), strict=True)))
