"""Points of covariate patterns, larger where `size` is larger, with level lines to read them against."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, SMALL, WIDTH, Sheet
from oddsmodel.report.figures.lettering import fold
from oddsmodel.report.figures.plot import Plot
from oddsmodel.report.figures.scales import plain_labels, plain_ticks
from oddsmodel.report.figures.strokes import number
from oddsmodel.results.figures import ScatterFigure

_LEFT, _TOP, _WIDTH, _HEIGHT = 48.0, 30.0, 322.0, 250.0
_SIZES = (3.0, 5.0, 7.5, 10.5, 14.0)
_SPOT = 2.0
_MOST_DOTS = 4000

Array = NDArray[np.float64]


def draw(figure: ScatterFigure) -> Sheet:
    title = fold(figure.x_label, SMALL, _WIDTH)
    sheet = Sheet(_TOP + _HEIGHT + 28.0 + 16.0 * len(title))
    sheet.text(0, 14, fold(figure.y_label, SMALL, WIDTH, lines=1)[0], size=SMALL, colour=INK)
    x, y, size = (np.asarray(values, dtype=float) for values in (figure.x, figure.y, figure.size))
    across, up = _range(x, ()), _range(y, figure.lines)
    plot = Plot(sheet, _LEFT, _TOP, _WIDTH, _HEIGHT, x=across, y=up)
    ticks = plain_ticks(*across)
    plot.bottom_axis(ticks, plain_labels(ticks), grid=True)
    ticks = plain_ticks(*up)
    plot.left_axis(ticks, plain_labels(ticks))
    points = np.column_stack([plot.x.at(x), plot.y.at(y)])
    grade = _grades(size)
    for place, diameter in enumerate(_SIZES):
        _dots(plot, _thinned(points[grade == place], max(_SPOT, diameter / 3)), diameter)
    for level in figure.lines:
        plot.level(level, MUTED, width=1.2, dashes=(4.0, 3.0))
    for place, words in enumerate(title):
        sheet.text(_LEFT + _WIDTH, _TOP + _HEIGHT + 36 + 16 * place, words, size=SMALL, anchor="end")
    return sheet


def _dots(plot: Plot, points: Array, diameter: float) -> None:
    """All dots of one size as one path of strokes without length and with round ends: few bytes a dot."""
    if not len(points):
        return
    data = "".join([f"M{number(x)} {number(y)}h0" for x, y in points.tolist()])
    style = f"fill:none;stroke:{FIRST};stroke-width:{diameter:g};stroke-linecap:round;opacity:0.45"
    plot.put(f'<path d="{data}" style="{style}"/>')


def _range(values: Array, also: tuple[float, ...]) -> tuple[float, float]:
    every = np.concatenate([values, np.asarray(also, dtype=float)])
    low, high = (float(every.min()), float(every.max())) if every.size else (0.0, 1.0)
    margin = 0.04 * (high - low) or max(abs(low), 1.0) * 0.04
    return low - margin, high + margin


def _grades(size: Array) -> NDArray[np.intp]:
    """The grade of each point's size (n,), by area: a few sizes are all that an eye tells apart."""
    largest = float(size.max()) if size.size else 1.0
    share = np.sqrt(np.maximum(size, 0.0) / (largest or 1.0))
    return np.minimum((share * len(_SIZES)).astype(np.intp), len(_SIZES) - 1)


def _thinned(points: Array, spot: float) -> Array:
    """One point (k, 2) for all (n, 2) on the same spot of the drawing: what is hidden beneath is left out."""
    across, down = np.floor(points / spot).astype(np.int64).T
    _, first = np.unique(across * (1 << 32) + down, return_index=True)
    return points[np.sort(first)] if len(first) <= _MOST_DOTS else _thinned(points, 1.5 * spot)
