"""Shares over the same bins for two or more groups, laid over one another."""

from __future__ import annotations

import numpy as np

from oddsmodel.report.figures.canvas import INK, LINE, MUTED, SERIES, SMALL, KeyEntry, Sheet
from oddsmodel.report.figures.lettering import fold
from oddsmodel.report.figures.plot import Plot
from oddsmodel.report.figures.scales import percent_labels, plain_labels, plain_ticks
from oddsmodel.results.figures import HistogramFigure
from oddsmodel.wording import say

_LEFT, _WIDTH, _HEIGHT = 46.0, 322.0, 220.0
_DASHES = ((), (5.0, 2.0), (1.5, 1.5), (7.0, 2.0, 1.5, 2.0))


def draw(figure: HistogramFigure) -> Sheet:
    withheld = any(count is None for _, counts in figure.series for count in counts)
    entries = [
        KeyEntry(fold(name, SMALL, _WIDTH, lines=1)[0], SERIES[k % len(SERIES)], _DASHES[k % len(_DASHES)])
        for k, (name, _) in enumerate(figure.series)
    ]
    key = Sheet.key_height(entries)
    top = key + (LINE if withheld else 0.0) + 30.0
    title = fold(figure.x_label, SMALL, _WIDTH)
    sheet = Sheet(top + _HEIGHT + 28.0 + 16.0 * len(title))
    sheet.key(entries)
    if withheld:
        sheet.text(0, 14.0 + key, say("figure-bins-withheld"), size=SMALL, colour=MUTED)
    sheet.text(0, top - 8, say("figure-share-of-group"), size=SMALL, colour=INK)

    counted = [np.array([count or 0 for count in counts], dtype=float) for _, counts in figure.series]
    shares = [counts / max(float(counts.sum()), 1.0) for counts in counted]
    highest = 1.08 * (max((float(share.max(initial=0.0)) for share in shares), default=0.0) or 1.0)
    low, high = figure.edges[0], figure.edges[-1]
    plot = Plot(sheet, _LEFT, top, _WIDTH, _HEIGHT, x=(low, high), y=(0.0, highest))
    ticks = plain_ticks(low, high)
    plot.bottom_axis(ticks, plain_labels(ticks))
    ticks = plain_ticks(0.0, highest, about=4)
    plot.left_axis(ticks, percent_labels(ticks))
    edges = np.repeat(np.asarray(figure.edges, dtype=float), 2)
    for share, entry in zip(shares, entries, strict=True):
        steps = np.concatenate([[0.0], np.repeat(share, 2), [0.0]])
        plot.between(edges, np.zeros(len(edges)), steps, entry.colour, 0.16)
        plot.line(edges, steps, entry.colour, width=1.8, dashes=entry.dashes)
    for place, words in enumerate(title):
        sheet.text(_LEFT + _WIDTH, top + _HEIGHT + 36 + 16 * place, words, size=SMALL, anchor="end")
    return sheet
