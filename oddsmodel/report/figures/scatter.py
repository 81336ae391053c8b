"""Points of covariate patterns, larger where `size` is larger, with level lines to read them against."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, RULE, SMALL, Sheet
from oddsmodel.report.figures.lettering import fold
from oddsmodel.report.figures.scales import plain_labels, plain_ticks
from oddsmodel.results.figures import ScatterFigure

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_LEFT, _TOP, _WIDTH, _HEIGHT = 48.0, 30.0, 322.0, 250.0
_SIZES = (3.0, 5.0, 7.5, 10.5, 14.0)
_SPOT = 2.0
_MOST_DOTS = 4000

Array = NDArray[np.float64]


def draw(figure: ScatterFigure) -> Sheet:
    title = fold(figure.x_label, SMALL, _WIDTH)
    sheet = Sheet(_TOP + _HEIGHT + 28.0 + 16.0 * len(title))
    axes = sheet.plot(_LEFT, _TOP, _WIDTH, _HEIGHT)
    x, y, size = (np.asarray(values, dtype=float) for values in (figure.x, figure.y, figure.size))
    x_low, x_high = _range(x, ())
    y_low, y_high = _range(y, figure.lines)
    unit = np.array([(x_high - x_low) / _WIDTH, (y_high - y_low) / _HEIGHT])
    grade = _grades(size)
    for number, diameter in enumerate(_SIZES):
        chosen = grade == number
        _dots(axes, _thinned(x[chosen], y[chosen], unit * max(_SPOT, diameter / 3)), diameter)
    for level in figure.lines:
        axes.axhline(level, color=MUTED, linewidth=1.2, linestyle=(0, (4, 3)))
    axes.set_xlim(x_low, x_high)
    axes.set_ylim(y_low, y_high)
    ticks = plain_ticks(x_low, x_high)
    axes.set_xticks(ticks, labels=plain_labels(ticks))
    ticks = plain_ticks(y_low, y_high)
    axes.set_yticks(ticks, labels=plain_labels(ticks))
    axes.grid(color=RULE, linewidth=0.6)
    axes.set_axisbelow(True)
    sheet.text(0, 14, fold(figure.y_label, SMALL, sheet.width, lines=1)[0], size=SMALL, colour=INK)
    for number, words in enumerate(title):
        sheet.text(_LEFT + _WIDTH, _TOP + _HEIGHT + 36 + 16 * number, words, size=SMALL, ha="right")
    return sheet


def _dots(axes: Axes, points: Array, diameter: float) -> None:
    """All dots of one size as one path of strokes without length and with round ends: few bytes a dot."""
    from matplotlib.patches import PathPatch
    from matplotlib.path import Path

    if not len(points):
        return
    strokes = Path(np.repeat(points, 2, axis=0), np.tile([Path.MOVETO, Path.LINETO], len(points)))
    strokes.should_simplify = False
    axes.add_patch(
        PathPatch(
            strokes, edgecolor=FIRST, facecolor="none", linewidth=diameter, capstyle="round", alpha=0.45, zorder=2
        )
    )


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


def _thinned(x: Array, y: Array, spot: Array) -> Array:
    """One point (k, 2) for all that fall on the same spot of the drawing: what is hidden beneath is left out."""
    points = np.column_stack([x, y])
    if not len(points):
        return points
    _, first = np.unique(np.floor(points / spot).astype(np.int64), axis=0, return_index=True)
    return points[np.sort(first)] if len(first) <= _MOST_DOTS else _thinned(x, y, 1.5 * spot)
