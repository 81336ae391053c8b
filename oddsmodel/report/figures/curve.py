"""Odds ratio along a number column: curve with band, straight line, reference value, and where the records lie."""

from __future__ import annotations

import numpy as np

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, PAPER, RING, SECOND, SMALL, KeyEntry, Sheet
from oddsmodel.report.figures.lettering import fold
from oddsmodel.report.figures.plot import Plot
from oddsmodel.report.figures.scales import plain_labels, plain_ticks, ratio_label, ratio_range, ratio_ticks
from oddsmodel.report.figures.strokes import marker, outline, wash
from oddsmodel.results.figures import CurveFigure, CurvePoint
from oddsmodel.wording import say

_LEFT, _WIDTH, _HEIGHT, _STRIP = 46.0, 326.0, 210.0, 46.0
_STRAIGHT, _SPOT = (5.0, 3.0), 7.0


def draw(figure: CurveFigure) -> Sheet:
    title = fold(figure.x_label, SMALL, _WIDTH)
    entries = [
        KeyEntry(say("figure-groups"), FIRST, ring=True) if figure.points else KeyEntry(say("figure-curve"), FIRST),
        KeyEntry(say("figure-straight"), SECOND, _STRAIGHT),
        KeyEntry(say("figure-reference", value=plain_labels([figure.reference])[0]), INK, ring=True, stroke=1.0),
    ]
    top = Sheet.key_height(entries) + 30.0
    bottom = top + _HEIGHT + (_STRIP if figure.density else 0.0)
    sheet = Sheet(bottom + 28.0 + 16.0 * len(title))
    sheet.key(entries)
    sheet.text(0, top - 8, say("figure-odds-ratio-log"), size=SMALL, colour=INK)

    across = (min(figure.x), max(figure.x))
    limits = [limit for point in figure.points for limit in (point.lower, point.upper) if limit is not None]
    estimates = (*figure.curve, *figure.straight, *(point.ratio for point in figure.points))
    low, high = ratio_range(estimates, (*figure.lower, *figure.upper, *limits), beyond=4.0)
    plot = Plot(sheet, _LEFT, top, _WIDTH, _HEIGHT, x=across, y=(low, high), log=True)
    ticks = ratio_ticks(low, high, _HEIGHT, apart=26.0)
    plot.left_axis(ticks, [ratio_label(tick) for tick in ticks])
    ticks = plain_ticks(*across)
    if figure.density:
        plot.bottom_axis()
        _density(sheet, figure, across, top + _HEIGHT).bottom_axis(ticks, plain_labels(ticks))
    else:
        plot.bottom_axis(ticks, plain_labels(ticks))
    if figure.curve:
        plot.between(figure.x, figure.lower, figure.upper, FIRST, 0.16)
    plot.level(1.0, MUTED, width=1.4)
    plot.line(figure.x, figure.straight, SECOND, width=1.8, dashes=_STRAIGHT)
    if figure.curve:
        plot.line(figure.x, figure.curve, FIRST, width=2.4)
    for point in figure.points:
        _point(plot, point)
    x, y = float(plot.x.at(figure.reference)), float(plot.y.at(1.0))
    plot.put(marker(x, y, "circle", RING, INK, PAPER, 1.0))
    for place, words in enumerate(title):
        sheet.text(_LEFT + _WIDTH, bottom + 36 + 16 * place, words, size=SMALL, anchor="end")
    return sheet


def _point(plot: Plot, point: CurvePoint) -> None:
    """A group: its odds ratio with its interval, the reference without one."""
    if point.lower is not None and point.upper is not None:
        plot.line([point.x, point.x], [point.lower, point.upper], FIRST, width=1.8)
    x, y = float(plot.x.at(point.x)), float(plot.y.at(point.ratio))
    plot.put(marker(x, y, "circle", _SPOT, FIRST, FIRST, 1.0))


def _density(sheet: Sheet, figure: CurveFigure, across: tuple[float, float], top: float) -> Plot:
    """Where the records lie: bars by bin, their heights records per unit of the column."""
    lower, upper, records = (np.array(values, dtype=float) for values in zip(*figure.density, strict=True))
    share = np.nan_to_num(records) / np.maximum(upper - lower, 1e-300)
    strip = Plot(sheet, _LEFT, top, _WIDTH, _STRIP, x=across, y=(0.0, max(float(share.max()), 1e-300) * 1.25))
    left, right, height = strip.x.at(lower), strip.x.at(upper), strip.y.at(share)
    floor = np.full(len(share), strip.y.start)
    corners_x = np.column_stack([left, right, right, left]).tolist()
    corners_y = np.column_stack([floor, floor, height, height]).tolist()
    bars = "".join(outline(x, y) for x, y in zip(corners_x, corners_y, strict=True))
    strip.put(wash(bars, MUTED, 0.45))
    return strip
