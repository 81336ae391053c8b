"""A curve along a number column, without the values that only a few records have."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

from oddsmodel.results.figures import CurveFigure


def coarsen_curve(figure: CurveFigure, threshold: int) -> CurveFigure | None:
    """The curve cut off where few records lie beyond, its bins merged until none holds a small count.

    At least `threshold` records lie beyond either end. Edges of bins are rounded, so that the extremes cannot be worked
    out from evenly spaced ones. Where no bins tell where the records lie, a twentieth of the range is cut off at either
    end. Points of groups of fewer records are left out. None where nothing is left.
    """
    bins = _inner_bins(figure.density, threshold)
    unit: float | None = None
    if figure.density:
        if not bins:
            return None
        unit = _unit(min(upper - lower for lower, upper, _ in bins))
        bins = [(_rounded(lower, unit), _rounded(upper, unit), records) for lower, upper, records in bins]
        low, high = bins[0][0], bins[-1][1]
    else:
        margin = (max(figure.x) - min(figure.x)) / 20
        low, high = min(figure.x) + margin, max(figure.x) - margin
    kept = [k for k, x in enumerate(figure.x) if low <= x <= high]
    if len(kept) < 2:
        return None

    def cut(values: Sequence[float]) -> tuple[float, ...]:
        return tuple(values[k] for k in kept) if values else ()

    points = tuple(
        point if unit is None or point.x == figure.reference else replace(point, x=_rounded(point.x, unit))
        for point in figure.points
        if low <= point.x <= high and point.records >= threshold
    )
    if figure.points and not points:
        return None

    return replace(
        figure,
        x=cut(figure.x),
        curve=cut(figure.curve),
        lower=cut(figure.lower),
        upper=cut(figure.upper),
        straight=cut(figure.straight),
        density=tuple(bins),
        points=points,
    )


def _inner_bins(
    density: Sequence[tuple[float, float, int | None]], threshold: int
) -> list[tuple[float, float, int | None]]:
    """The bins without the outermost `threshold` records at either end, neighbours merged until safe."""
    counts = [records or 0 for _, _, records in density]
    first, last = 0, len(density)
    while first < last and sum(counts[:first]) < threshold:
        first += 1
    while last > first and sum(counts[last:]) < threshold:
        last -= 1
    merged: list[tuple[float, float, int | None]] = []
    start = first
    for k in range(first, last):
        records = sum(counts[start : k + 1])
        if records == 0 or records >= threshold:
            merged.append((density[start][0], density[k][1], records))
            start = k + 1
    if start < last:
        together, lower = sum(counts[start:last]), density[start][0]
        while merged and 0 < together < threshold:
            lower, _, before = merged.pop()
            together += before or 0
        if 0 < together < threshold:
            return []
        merged.append((lower, density[last - 1][1], together))
    return merged


def _unit(width: float) -> float:
    """A power of ten of at most a quarter of a bin's width."""
    return float(10.0 ** math.floor(math.log10(width / 4)))


def _rounded(value: float, unit: float) -> float:
    digits = max(0, -round(math.log10(unit)))
    return round(round(value / unit) * unit, digits)
