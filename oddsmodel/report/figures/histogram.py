"""Shares over the same bins for two or more groups, laid over one another."""

from __future__ import annotations

import numpy as np

from oddsmodel.report.figures.canvas import INK, LINE, MUTED, RULE, SERIES, SMALL, Sheet
from oddsmodel.report.figures.lettering import fold
from oddsmodel.report.figures.scales import percent_labels, plain_labels, plain_ticks
from oddsmodel.results.figures import HistogramFigure
from oddsmodel.wording import say

_LEFT, _WIDTH, _HEIGHT = 46.0, 322.0, 220.0
_STYLES = ("-", (0, (5, 2)), (0, (1.5, 1.5)), (0, (7, 2, 1.5, 2)))


def draw(figure: HistogramFigure) -> Sheet:
    withheld = any(count is None for _, counts in figure.series for count in counts)
    entries = [
        (fold(name, SMALL, _WIDTH, lines=1)[0], SERIES[k % len(SERIES)], {"linestyle": _STYLES[k % len(_STYLES)]})
        for k, (name, _) in enumerate(figure.series)
    ]
    key = Sheet.key_height(entries)
    top = key + (LINE if withheld else 0.0) + 30.0
    title = fold(figure.x_label, SMALL, _WIDTH)
    sheet = Sheet(top + _HEIGHT + 28.0 + 16.0 * len(title))
    axes = sheet.plot(_LEFT, top, _WIDTH, _HEIGHT)
    edges = np.asarray(figure.edges, dtype=float)
    highest = 0.0
    for k, (_, counts) in enumerate(figure.series):
        known = np.array([np.nan if count is None else count for count in counts], dtype=float)
        shares = known / max(float(np.nansum(known)), 1.0)
        highest = max(highest, float(np.nanmax(shares, initial=0.0)))
        colour = SERIES[k % len(SERIES)]
        heights = np.nan_to_num(shares)
        axes.stairs(heights, edges, color=colour, fill=True, alpha=0.16, linewidth=0)
        axes.stairs(heights, edges, color=colour, linewidth=1.8, linestyle=_STYLES[k % len(_STYLES)])
    axes.set_xlim(edges[0], edges[-1])
    axes.set_ylim(0, (highest or 1.0) * 1.08)
    ticks = plain_ticks(float(edges[0]), float(edges[-1]))
    axes.set_xticks(ticks, labels=plain_labels(ticks))
    ticks = plain_ticks(0.0, (highest or 1.0) * 1.08, about=4)
    axes.set_yticks(ticks, labels=percent_labels(ticks))
    axes.grid(axis="y", color=RULE, linewidth=0.6)
    axes.set_axisbelow(True)
    sheet.key(entries)
    if withheld:
        sheet.text(0, 14.0 + key, say("figure-bins-withheld"), size=SMALL, colour=MUTED)
    sheet.text(0, top - 8, say("figure-share-of-group"), size=SMALL, colour=INK)
    for number, words in enumerate(title):
        sheet.text(_LEFT + _WIDTH, top + _HEIGHT + 36 + 16 * number, words, size=SMALL, ha="right")
    return sheet
