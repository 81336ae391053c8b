"""Points of covariate patterns, gathered until none stands for a few records."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import replace

from oddsmodel.results.figures import ScatterFigure
from oddsmodel.wording import say

CELLS_ACROSS = 24


def coarsen_scatter(figure: ScatterFigure, threshold: int) -> ScatterFigure | None:
    """Points gathered in the cells of a grid of round numbers.

    Cells with fewer records than the threshold are left out. A cell stands for its records at its middle; its size is
    the mean of its points' sizes, by records. None where no cell has enough records.
    """
    if not figure.x:
        return None
    steps = [_step(values) for values in (figure.x, figure.y)]
    cells: dict[tuple[int, int], list[int]] = defaultdict(list)
    for k, (x, y) in enumerate(zip(figure.x, figure.y, strict=True)):
        cells[math.floor(x / steps[0]), math.floor(y / steps[1])].append(k)
    middles: list[tuple[float, float]] = []
    size: list[float] = []
    records: list[int] = []
    for place in sorted(cells):
        number = sum(figure.records[k] for k in cells[place])
        if number < threshold:
            continue
        middles.append((_middle(place[0], steps[0]), _middle(place[1], steps[1])))
        mean = sum(figure.size[k] * figure.records[k] for k in cells[place]) / number
        size.append(float(f"{mean:.2g}"))
        records.append(number)
    if not records:
        return None
    alt = f"{figure.alt} {say('points-gathered', threshold=threshold)}".strip()
    return replace(
        figure,
        alt=alt,
        x=tuple(x for x, _ in middles),
        y=tuple(y for _, y in middles),
        size=tuple(size),
        records=tuple(records),
    )


def _middle(cell: int, step: float) -> float:
    return float(f"{(cell + 0.5) * step:.9g}")


def _step(values: Sequence[float]) -> float:
    """A round number, 1, 2 or 5 times a power of ten, of which about 24 cover the values."""
    spread = max(values) - min(values)
    # All values equal: one cell of any size holds them.
    if spread <= 0:
        return 1.0
    power = 10.0 ** math.floor(math.log10(spread / CELLS_ACROSS))
    return next(step * power for step in (1.0, 2.0, 5.0, 10.0) if step * power * CELLS_ACROSS >= spread)
