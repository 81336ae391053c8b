"""One odds ratio under many choices of adjustment columns: points in their order, level lines to read them against."""

from __future__ import annotations

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, SECOND, SMALL, KeyEntry, Sheet
from oddsmodel.report.figures.lettering import fold
from oddsmodel.report.figures.plot import Plot
from oddsmodel.report.figures.scales import ratio_label, ratio_range, ratio_ticks
from oddsmodel.report.figures.strokes import number
from oddsmodel.results.figures import SpreadFigure
from oddsmodel.wording import say

_LEFT, _WIDTH, _HEIGHT = 46.0, 326.0, 210.0
_REPORTED, _ALONE = (5.0, 3.0), (1.5, 2.5)
_WIDEST, _NARROWEST = 8.0, 2.5


def draw(figure: SpreadFigure) -> Sheet:
    entries = [KeyEntry(say("figure-reported"), SECOND, _REPORTED)]
    if figure.alone is not None:
        entries.append(KeyEntry(say("figure-unadjusted"), MUTED, _ALONE))
    title = fold(say("figure-choices"), SMALL, _WIDTH)
    top = Sheet.key_height(entries) + 30.0
    bottom = top + _HEIGHT
    sheet = Sheet(bottom + 12.0 + 16.0 * len(title))
    sheet.key(entries)
    sheet.text(0, top - 8, say("figure-odds-ratio-log"), size=SMALL, colour=INK)
    count = len(figure.estimates)
    low, high = ratio_range((*figure.estimates, figure.reported, figure.alone or 1.0), ())
    plot = Plot(sheet, _LEFT, top, _WIDTH, _HEIGHT, x=(0.0, count + 1.0), y=(low, high), log=True)
    ticks = ratio_ticks(low, high, _HEIGHT, apart=26.0)
    plot.left_axis(ticks, [ratio_label(tick) for tick in ticks])
    plot.bottom_axis()
    plot.level(1.0, MUTED, width=1.4)
    if figure.alone is not None:
        plot.level(figure.alone, MUTED, width=1.8, dashes=_ALONE)
    plot.level(figure.reported, SECOND, width=1.8, dashes=_REPORTED)
    x, y = plot.x.at(range(1, count + 1)).tolist(), plot.y.at(figure.estimates).tolist()
    data = "".join(f"M{number(across)} {number(down)}h0" for across, down in zip(x, y, strict=True))
    wide = min(_WIDEST, max(_NARROWEST, 0.7 * _WIDTH / max(count, 1)))
    if data:
        style = f"fill:none;stroke:{FIRST};stroke-width:{wide:g};stroke-linecap:round"
        plot.put(f'<path d="{data}" style="{style}"/>')
    for place, words in enumerate(title):
        sheet.text(_LEFT + _WIDTH, bottom + 18 + 16 * place, words, size=SMALL, anchor="end")
    return sheet
