"""Precision against recall, with the share of events that a coin's toss would find."""

from __future__ import annotations

import numpy as np

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, SMALL, TEXT, KeyEntry, Sheet
from oddsmodel.report.figures.plot import Plot
from oddsmodel.report.figures.scales import percent_labels, plain_ticks
from oddsmodel.results.figures import PrecisionFigure
from oddsmodel.wording import numbers, say

_LEFT, _SIDE = 48.0, 312.0
_COIN = (4.0, 3.0)


def draw(figure: PrecisionFigure) -> Sheet:
    entries = [KeyEntry(say("figure-coin"), MUTED, _COIN, stroke=1.2)]
    top = Sheet.key_height(entries) + 30.0
    sheet = Sheet(top + _SIDE + 52.0)
    sheet.key(entries)
    sheet.text(0, top - 10, say("figure-precision"), size=SMALL, colour=INK)
    plot = Plot(sheet, _LEFT, top, _SIDE, _SIDE, x=(0.0, 1.0), y=(0.0, 1.0))
    ticks = plain_ticks(0.0, 1.0)
    plot.bottom_axis(ticks, percent_labels(ticks), grid=True)
    plot.left_axis(ticks, percent_labels(ticks))
    plot.level(figure.share, MUTED, width=1.2, dashes=_COIN)
    points = np.asarray(figure.points, dtype=float).reshape(-1, 2)
    if len(points):
        plot.line(points[:, 0], points[:, 1], FIRST, width=2.2)
    words = say("figure-average-precision", average=numbers.decimal(figure.average, 3))
    sheet.text(_LEFT + _SIDE - 14, top + 24, words, size=TEXT, anchor="end", bold=True)
    sheet.text(_LEFT + _SIDE, top + _SIDE + 42, say("figure-recall"), size=SMALL, colour=INK, anchor="end")
    return sheet
