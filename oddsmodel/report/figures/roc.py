"""The receiver operating characteristic curve, with the diagonal of a coin's toss."""

from __future__ import annotations

import numpy as np

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, RULE, SMALL, TEXT, Sheet
from oddsmodel.report.figures.scales import percent_labels, plain_ticks
from oddsmodel.results.figures import StepFigure
from oddsmodel.wording import numbers, say

_LEFT, _TOP, _SIDE = 48.0, 30.0, 312.0
_MOST_POINTS = 400


def draw(figure: StepFigure) -> Sheet:
    sheet = Sheet(_TOP + _SIDE + 52.0)
    axes = sheet.plot(_LEFT, _TOP, _SIDE, _SIDE)
    axes.set_xlim(0, 1)
    axes.set_ylim(0, 1)
    ticks = plain_ticks(0.0, 1.0)
    axes.set_xticks(ticks, labels=percent_labels(ticks))
    axes.set_yticks(ticks, labels=percent_labels(ticks))
    axes.grid(color=RULE, linewidth=0.6)
    axes.set_axisbelow(True)
    axes.plot([0, 1], [0, 1], color=MUTED, linewidth=1.2, linestyle=(0, (4, 3)))
    points = np.asarray(figure.points, dtype=float).reshape(-1, 2)
    if len(points) > _MOST_POINTS:
        points = points[np.unique(np.linspace(0, len(points) - 1, _MOST_POINTS).round().astype(int))]
    axes.fill_between(points[:, 0], points[:, 1], color=FIRST, alpha=0.12, linewidth=0)
    axes.plot(points[:, 0], points[:, 1], color=FIRST, linewidth=2.2, clip_on=False)
    words = say("figure-area", area=numbers.decimal(figure.area, 3))
    sheet.text(_LEFT + _SIDE - 14, _TOP + _SIDE - 20, words, size=TEXT, ha="right", weight="bold")
    sheet.text(0, 14, say("figure-true-positive"), size=SMALL, colour=INK)
    sheet.text(_LEFT + _SIDE, _TOP + _SIDE + 42, say("figure-false-positive"), size=SMALL, colour=INK, ha="right")
    return sheet
