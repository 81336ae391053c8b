"""The receiver operating characteristic curve, with the diagonal of a coin's toss."""

from __future__ import annotations

import numpy as np

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, SMALL, TEXT, Sheet
from oddsmodel.report.figures.plot import Plot
from oddsmodel.report.figures.scales import percent_labels, plain_ticks
from oddsmodel.results.figures import StepFigure
from oddsmodel.wording import numbers, say

_LEFT, _TOP, _SIDE = 48.0, 30.0, 312.0
_MOST_POINTS = 400


def draw(figure: StepFigure) -> Sheet:
    sheet = Sheet(_TOP + _SIDE + 52.0)
    sheet.text(0, 14, say("figure-true-positive"), size=SMALL, colour=INK)
    plot = Plot(sheet, _LEFT, _TOP, _SIDE, _SIDE, x=(0.0, 1.0), y=(0.0, 1.0))
    ticks = plain_ticks(0.0, 1.0)
    plot.bottom_axis(ticks, percent_labels(ticks), grid=True)
    plot.left_axis(ticks, percent_labels(ticks))
    points = np.asarray(figure.points, dtype=float).reshape(-1, 2)
    if len(points) > _MOST_POINTS:
        points = points[np.unique(np.linspace(0, len(points) - 1, _MOST_POINTS).round().astype(int))]
    x, y = points.T
    if len(points):
        plot.between(x, np.zeros(len(x)), y, FIRST, 0.12)
    plot.line([0, 1], [0, 1], MUTED, width=1.2, dashes=(4.0, 3.0))
    if len(points):
        sheet.line(plot.x.at(x).tolist(), plot.y.at(y).tolist(), FIRST, width=2.2)
    words = say("figure-area", area=numbers.decimal(figure.area, 3))
    sheet.text(_LEFT + _SIDE - 14, _TOP + _SIDE - 20, words, size=TEXT, anchor="end", bold=True)
    words = say("figure-false-positive")
    sheet.text(_LEFT + _SIDE, _TOP + _SIDE + 42, words, size=SMALL, colour=INK, anchor="end")
    return sheet
