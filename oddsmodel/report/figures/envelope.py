"""Ordered values among those of simulations: points, the band that the simulations span, and their mean."""

from __future__ import annotations

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, SMALL, WIDTH, KeyEntry, Sheet
from oddsmodel.report.figures.lettering import fold
from oddsmodel.report.figures.plot import Plot
from oddsmodel.report.figures.scales import plain_labels, plain_ticks
from oddsmodel.report.figures.strokes import marker
from oddsmodel.results.figures import EnvelopeFigure
from oddsmodel.wording import say

_LEFT, _WIDTH, _HEIGHT = 48.0, 322.0, 250.0
_MIDDLE, _SPOT = (4.0, 3.0), 4.5


def draw(figure: EnvelopeFigure) -> Sheet:
    title = fold(figure.x_label, SMALL, _WIDTH)
    entries = [
        KeyEntry(say("figure-envelope-observed"), FIRST, ring=True),
        KeyEntry(say("figure-envelope-mean"), MUTED, _MIDDLE),
    ]
    top = Sheet.key_height(entries) + 30.0
    sheet = Sheet(top + _HEIGHT + 28.0 + 16.0 * len(title))
    sheet.key(entries)
    sheet.text(0, top - 8, fold(figure.y_label, SMALL, WIDTH, lines=1)[0], size=SMALL, colour=INK)
    across = (0.0, 1.04 * max(figure.x))
    up = (0.0, 1.04 * max(*figure.observed, *figure.upper))
    plot = Plot(sheet, _LEFT, top, _WIDTH, _HEIGHT, x=across, y=up)
    ticks = plain_ticks(*across)
    plot.bottom_axis(ticks, plain_labels(ticks))
    ticks = plain_ticks(*up)
    plot.left_axis(ticks, plain_labels(ticks))
    plot.between(figure.x, figure.lower, figure.upper, MUTED, 0.2)
    plot.line(figure.x, figure.middle, MUTED, width=1.4, dashes=_MIDDLE)
    for x, y in zip(plot.x.at(figure.x).tolist(), plot.y.at(figure.observed).tolist(), strict=True):
        plot.put(marker(x, y, "circle", _SPOT, FIRST, FIRST, 1.0))
    for place, words in enumerate(title):
        sheet.text(_LEFT + _WIDTH, top + _HEIGHT + 36 + 16 * place, words, size=SMALL, anchor="end")
    return sheet
