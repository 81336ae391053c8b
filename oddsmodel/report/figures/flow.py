"""Who was counted: a line from the records read to those analysed, each reason for leaving out branching off."""

from __future__ import annotations

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, PAPER, RULE, SECOND, SMALL, TEXT, WIDTH, Sheet
from oddsmodel.report.figures.lettering import fold, width_of
from oddsmodel.report.figures.strokes import marker
from oddsmodel.results.figures import FlowFigure
from oddsmodel.wording import numbers, say

_SPINE = 12.0
_BRANCH = 44.0
_COUNT_END = 108.0
_WORDS = 120.0
_BIG = 22.0
_ROW = 19.0


def draw(figure: FlowFigure) -> Sheet:
    reasons = [(fold(reason, TEXT, WIDTH - _WORDS), left_out) for reason, left_out in figure.left_out]
    heights = [max(34.0, _ROW * len(lines) + 14.0) for lines, _ in reasons]
    end = 58.0 + sum(heights) + 22.0
    sheet = Sheet(end + (46.0 if figure.events is not None else 28.0))

    sheet.line([_SPINE, _SPINE], [18.0, end], RULE, width=4.0)
    _station(sheet, 18.0, figure.read, say("figure-records-read"), INK)
    top = 58.0
    for (lines, left_out), height in zip(reasons, heights, strict=True):
        _branch(sheet, top, lines, left_out)
        top += height
    _station(sheet, end, figure.analysed, say("figure-records-analysed"), FIRST)
    if figure.events is not None:
        words = say("figure-of-whom-events", events=figure.events)
        sheet.text(_BRANCH - 10, end + 30.0, words, size=TEXT, colour=MUTED)
    return sheet


def _station(sheet: Sheet, y: float, count: int | None, words: str, colour: str) -> None:
    sheet.paint(marker(_SPINE, y, "circle", 15.0, colour, PAPER, 4.0))
    amount = numbers.count(count) if count is not None else say("figure-withheld")
    size = _BIG if count is not None else TEXT
    sheet.text(_BRANCH - 10, y + 7.5, amount, size=size, colour=colour, bold=True)
    offset = 1.06 * width_of(amount, size) + 9
    sheet.text(_BRANCH - 10 + offset, y + 7.5, words, size=TEXT, colour=INK)


def _branch(sheet: Sheet, y: float, lines: list[str], count: int | None) -> None:
    sheet.line([_SPINE, _SPINE + 10, _BRANCH], [y - 12, y, y], RULE, width=2.0)
    sheet.line([_BRANCH - 6, _BRANCH, _BRANCH - 6], [y - 4, y, y + 4], SECOND, width=1.6)
    amount = f"\u2212\u2009{numbers.count(count)}" if count is not None else say("figure-withheld")
    colour, size = (SECOND, TEXT) if count is not None else (MUTED, SMALL)
    sheet.text(_COUNT_END, y + 4.5, amount, size=size, colour=colour, anchor="end")
    for number, words in enumerate(lines):
        sheet.text(_WORDS, y + 4.5 + _ROW * number, words, size=TEXT, colour=MUTED)
