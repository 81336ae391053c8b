"""A curve of true against false positive shares on a grid so wide that no single record's step shows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from oddsmodel.results.figures import StepFigure

MOST_STEPS = 40
ROUNDING = 50
"""True positive shares are rounded to a fiftieth."""


def coarsen_steps(figure: StepFigure, threshold: int, events: int, others: int) -> StepFigure | None:
    """The curve on an even grid of false positive shares of at most 41 points, its heights rounded to 0.02.

    A step of the grid holds at least `threshold` records without the event and there are no more steps than `events`
    fills with as many, so that no single record's step can be seen. None where not even two steps can be made.
    """
    steps = min(MOST_STEPS, others // threshold, events // threshold)
    if steps < 2 or len(figure.points) < 2:
        return None
    points = sorted(figure.points)
    inner = [k / steps for k in range(1, steps)]
    heights = [round(_height(points, share) * ROUNDING) / ROUNDING for share in inner]
    return replace(figure, points=((0.0, 0.0), *zip(inner, heights, strict=True), (1.0, 1.0)))


def _height(points: Sequence[tuple[float, float]], share: float) -> float:
    """The curve's height at a false positive share, along the straight line between its corners."""
    before = max((point for point in points if point[0] <= share), default=points[0])
    after = min((point for point in points if point[0] > share), default=points[-1])
    if after[0] <= before[0]:
        return before[1]
    return before[1] + (after[1] - before[1]) * (share - before[0]) / (after[0] - before[0])
