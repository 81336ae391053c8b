"""Figures made so coarse that no mark stands for fewer records than the threshold."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import replace

from oddsmodel.disclosure.suppression import Suppression
from oddsmodel.disclosure.system import CountSystem
from oddsmodel.results.figures import CurveFigure, HistogramFigure, ScatterFigure, StepFigure
from oddsmodel.wording import say

MOST_STEPS = 40
ROUNDING = 50
"""True positive shares are rounded to a fiftieth."""

CELLS_ACROSS = 24


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


def coarsen_histogram(figure: HistogramFigure, threshold: int) -> tuple[HistogramFigure, int] | None:
    """Bins with small counts withheld, with others so that none follows from the group's total; and how many.

    None where a whole group has fewer records than the threshold.
    """
    series = []
    withheld = 0
    for name, counts in figure.series:
        known = [count or 0 for count in counts]
        if 0 < sum(known) < threshold:
            return None
        hidden = _hidden_parts(known, threshold)
        withheld += len(hidden)
        series.append((name, tuple(None if k in hidden else count for k, count in enumerate(counts))))
    return replace(figure, series=tuple(series)), withheld


def _hidden_parts(parts: Sequence[int], threshold: int) -> set[int]:
    """Positions of the parts to hide where their sum is known."""
    system = CountSystem()
    numbers = [system.add(part, ("part", k)) for k, part in enumerate(parts)]
    system.relate(numbers, system.add(sum(parts), locked=True))
    counts = system.freeze()
    hidden = Suppression(counts, threshold).run()
    return {k for k in range(len(parts)) if counts.places["part", k] in hidden}


def coarsen_curve(figure: CurveFigure, threshold: int) -> CurveFigure | None:
    """The curve cut off where fewer than `threshold` records lie beyond, its bins merged until none holds a small count.

    Edges of bins are rounded, so that the extremes cannot be worked out from evenly spaced ones. Where no bins tell
    where the records lie, a twentieth of the range is cut off at either end. None where nothing is left.
    """
    bins = _inner_bins(figure.density, threshold)
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
        return tuple(values[k] for k in kept)

    return replace(
        figure,
        x=cut(figure.x),
        curve=cut(figure.curve),
        lower=cut(figure.lower),
        upper=cut(figure.upper),
        straight=cut(figure.straight),
        density=tuple(bins),
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
        rest = sum(counts[start:last])
        if not merged:
            return []
        lower, _, records = merged.pop()
        while merged and 0 < rest + (records or 0) < threshold:
            rest += records or 0
            lower, _, records = merged.pop()
        together = rest + (records or 0)
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


def coarsen_scatter(figure: ScatterFigure, threshold: int) -> ScatterFigure | None:
    """Points gathered in the cells of a grid of round numbers; cells with fewer records than the threshold are left out.

    A cell stands for its records at its middle. Its size is the mean of its points' sizes, by records. None where no
    cell has enough records.
    """
    if not figure.x:
        return None
    steps = [_step(values) for values in (figure.x, figure.y)]
    cells: dict[tuple[int, int], list[int]] = defaultdict(list)
    for k, (x, y) in enumerate(zip(figure.x, figure.y, strict=True)):
        cells[math.floor(x / steps[0]), math.floor(y / steps[1])].append(k)
    x, y, size, records = [], [], [], []
    for place in sorted(cells):
        number = sum(figure.records[k] for k in cells[place])
        if number < threshold:
            continue
        x.append(float(f"{(place[0] + 0.5) * steps[0]:.9g}"))
        y.append(float(f"{(place[1] + 0.5) * steps[1]:.9g}"))
        mean = sum(figure.size[k] * figure.records[k] for k in cells[place]) / number
        size.append(float(f"{mean:.2g}"))
        records.append(number)
    if not records:
        return None
    alt = f"{figure.alt} {say('points-gathered', threshold=threshold)}".strip()
    return replace(figure, alt=alt, x=tuple(x), y=tuple(y), size=tuple(size), records=tuple(records))


def _step(values: Sequence[float]) -> float:
    """A round number, 1, 2 or 5 times a power of ten, of which about 24 cover the values."""
    spread = max(values) - min(values)
    # All values equal: one cell of any size holds them.
    if spread <= 0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(spread / CELLS_ACROSS))
    return next(step * power for step in (1.0, 2.0, 5.0, 10.0) if step * power * CELLS_ACROSS >= spread)
