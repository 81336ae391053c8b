"""Observed share against predicted risk: groups with intervals, a smooth curve, and the line of agreement."""

from __future__ import annotations

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, PAPER, RING, SECOND, SMALL, KeyEntry, Sheet
from oddsmodel.report.figures.plot import Plot
from oddsmodel.report.figures.scales import percent_labels, plain_ticks
from oddsmodel.report.figures.strokes import marker
from oddsmodel.results.figures import CalibrationFigure
from oddsmodel.wording import say

_LEFT, _SIDE = 48.0, 318.0
_AGREEMENT = (4.0, 3.0)
_THIN, _EDGE = 1.2, 1.8


def draw(figure: CalibrationFigure) -> Sheet:
    entries = [KeyEntry(say("figure-agreement"), MUTED, _AGREEMENT, stroke=_THIN)]
    if figure.groups:
        entries.append(KeyEntry(say("figure-groups"), SECOND, ring=True, stroke=_EDGE))
    if figure.smooth:
        entries.append(KeyEntry(say("figure-smooth-band" if figure.band else "figure-smooth"), FIRST))
    top = Sheet.key_height(entries) + 30.0
    sheet = Sheet(top + _SIDE + 50.0)
    sheet.key(entries)
    sheet.text(0, top - 10, say("figure-observed-share"), size=SMALL, colour=INK)

    highest = _highest(figure)
    plot = Plot(sheet, _LEFT, top, _SIDE, _SIDE, x=(0.0, highest), y=(0.0, highest))
    ticks = plain_ticks(0.0, highest)
    plot.bottom_axis(ticks, percent_labels(ticks), grid=True)
    plot.left_axis(ticks, percent_labels(ticks))
    plot.line([0, highest], [0, highest], MUTED, width=_THIN, dashes=_AGREEMENT)
    if figure.band:
        predicted, lower, upper = zip(*figure.band, strict=True)
        plot.between(predicted, lower, upper, FIRST, 0.16)
    if figure.smooth:
        predicted, observed = zip(*figure.smooth, strict=True)
        plot.line(predicted, observed, FIRST, width=2.2)
    for group in figure.groups:
        plot.line([group.predicted] * 2, [group.lower, group.upper], SECOND, width=1.6)
    across = plot.x.at([group.predicted for group in figure.groups]).tolist()
    up = plot.y.at([group.observed for group in figure.groups]).tolist()
    for x, y in zip(across, up, strict=True):
        plot.put(marker(x, y, "circle", RING, SECOND, PAPER, _EDGE))
    sheet.text(_LEFT + _SIDE, top + _SIDE + 42, say("figure-predicted-risk"), size=SMALL, colour=INK, anchor="end")
    return sheet


def _highest(figure: CalibrationFigure) -> float:
    values = [value for group in figure.groups for value in (group.predicted, group.upper)]
    values += [value for point in figure.smooth for value in point]
    return min(1.0, 1.06 * max(values, default=1.0)) or 1.0
