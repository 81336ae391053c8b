"""Odds ratios with their intervals: one row an estimate, a log axis, the line at 1, the numbers at the right."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import groupby

from oddsmodel.report.figures.canvas import (
    FIRST,
    INK,
    LINE,
    MUTED,
    PAPER,
    RULE,
    SERIES,
    SMALL,
    TEXT,
    WIDTH,
    Sheet,
)
from oddsmodel.report.figures.lettering import fold, width_of
from oddsmodel.report.figures.scales import ratio_label, ratio_range, ratio_ticks
from oddsmodel.report.figures.strokes import SHAPES, marker
from oddsmodel.results.figures import EstimateMark, EstimatesFigure
from oddsmodel.wording import numbers, say

_NUMBERS_WIDTH = 138.0
_NAMES_WIDTH = 84.0
_GAP = 8.0
_UNDER_LABEL = 3.0
_TOP = 6.0
_BOLD = 1.1
"""How much wider bold letters are."""
CRUDE = "crude"
"""The series that is drawn in the background colour, wherever it stands."""


@dataclass(frozen=True, slots=True)
class _Row:
    mark: EstimateMark
    name: tuple[str, ...]
    numbers: tuple[str, ...]
    note: tuple[str, ...]

    @property
    def height(self) -> float:
        return 24.0 + LINE * (max(len(self.name), len(self.numbers), 1) - 1) + self.note_height

    @property
    def note_height(self) -> float:
        return 16.0 * len(self.note) + (4.0 if self.note else 0.0)


@dataclass(frozen=True, slots=True)
class _Axis:
    low: float
    high: float
    left: float
    right: float

    def at(self, value: float) -> float:
        share = math.log(value / self.low) / math.log(self.high / self.low)
        return self.left + share * (self.right - self.left)


def draw(figure: EstimatesFigure) -> Sheet:
    names = list(dict.fromkeys(mark.series for mark in figure.marks))
    drawn_as = {name: place for place, name in enumerate(sorted(names, key=lambda name: name == CRUDE))}
    several = len(names) > 1
    widest = max((width_of(name, SMALL) for name in names), default=0.0)
    left = min(widest, _NAMES_WIDTH) + 12.0 if several else 6.0
    axis = _axis(figure.marks, left, WIDTH - _NUMBERS_WIDTH - 6.0)
    blocks = [
        (fold(label, TEXT, WIDTH / _BOLD), [_row(mark, several) for mark in marks])
        for label, marks in groupby(figure.marks, key=lambda mark: mark.label)
    ]
    height = _TOP + sum(
        LINE * len(label) + _UNDER_LABEL + sum(row.height for row in rows) + _GAP for label, rows in blocks
    )

    sheet = Sheet(height + 58.0)
    ticks = ratio_ticks(axis.low, axis.high, axis.right - axis.left)
    top = _TOP
    for label, rows in blocks:
        for line in label:
            sheet.text(0, top + 12, line, bold=True)
            top += LINE
        top += _UNDER_LABEL
        for row in rows:
            _grid(sheet, axis, ticks, top, top + row.height - row.note_height)
            _estimate(sheet, row, axis, top, drawn_as[row.mark.series])
            top += row.height
        top += _GAP
    _scale(sheet, axis, ticks, height, figure.axis)
    return sheet


def _is_drawn(mark: EstimateMark) -> bool:
    """Whether there is an estimate, or a limit on one side without one."""
    return (mark.estimate, mark.lower, mark.upper) != (None, None, None)


def _row(mark: EstimateMark, several: bool) -> _Row:
    if mark.estimate is None:
        words = fold(say("at-limit", lower=mark.lower, upper=mark.upper), SMALL, _NUMBERS_WIDTH - 8.0)
    else:
        ratio = numbers.ratio(mark.estimate)
        room = _NUMBERS_WIDTH - 8.0
        interval = numbers.interval(mark.lower, mark.upper)
        beside = room - width_of(ratio, SMALL) - 8.0
        folded = fold(interval, SMALL, beside)
        words = [ratio, *(folded if len(folded) == 1 else fold(interval, SMALL, room))]
        words = [f"{words[0]}\u2003{words[1]}"] if len(folded) == 1 else words
    return _Row(
        mark=mark,
        name=tuple(fold(mark.series, SMALL, _NAMES_WIDTH)) if several else (),
        numbers=tuple(words),
        note=tuple(fold(mark.note, SMALL, WIDTH - 12.0)) if mark.note else (),
    )


def _axis(marks: tuple[EstimateMark, ...], left: float, right: float) -> _Axis:
    limits = [limit for mark in marks for limit in (mark.lower, mark.upper) if limit is not None]
    alone = [limit for mark in marks if mark.estimate is None for limit in (mark.lower, mark.upper) if limit]
    low, high = ratio_range([*(mark.estimate for mark in marks if mark.estimate is not None), *alone], limits)
    open_room = (high / low) ** 0.12
    drawn = [mark for mark in marks if _is_drawn(mark)]
    low = low / open_room if any(mark.lower is None for mark in drawn) else low
    high = high * open_room if any(mark.upper is None for mark in drawn) else high
    return _Axis(low, high, left, right)


def _grid(sheet: Sheet, axis: _Axis, ticks: tuple[float, ...], top: float, bottom: float) -> None:
    """Quiet rules behind one row, the line at 1 stronger."""
    for tick in ticks:
        sheet.line([axis.at(tick)] * 2, [top, bottom], RULE, width=0.8)
    sheet.line([axis.at(1.0)] * 2, [top - 1, bottom + 1], MUTED, width=1.4)


def _scale(sheet: Sheet, axis: _Axis, ticks: tuple[float, ...], bottom: float, title: str) -> None:
    sheet.line([axis.left, axis.right], [bottom, bottom], RULE)
    for tick in ticks:
        x = axis.at(tick)
        sheet.line([x, x], [bottom, bottom + 4], RULE)
        sheet.text(x, bottom + 17, ratio_label(tick), size=SMALL, colour=MUTED, anchor="middle")
    one = axis.at(1.0)
    if one - axis.left > 78:
        sheet.text(one - 8, bottom + 35, say("figure-lower-odds"), size=SMALL, colour=MUTED, anchor="end")
    if axis.right - one > 50:
        sheet.text(one + 8, bottom + 35, say("figure-higher-odds"), size=SMALL, colour=MUTED)
    sheet.text(axis.left, bottom + 53, title, size=SMALL, colour=MUTED)


def _estimate(sheet: Sheet, row: _Row, axis: _Axis, top: float, series: int) -> None:
    middle = top + 11.0
    mark = row.mark
    colour = SERIES[series % len(SERIES)]
    for number, words in enumerate(row.name):
        sheet.text(0, middle + 4 + LINE * number, words, size=SMALL, colour=MUTED)
    x = axis.right + 14.0
    for number, words in enumerate(row.numbers):
        sheet.text(x, middle + 4 + LINE * number, words, size=SMALL, colour=INK if _is_drawn(mark) else MUTED)
    if _is_drawn(mark):
        _interval(sheet, mark, axis, middle, colour)
    if mark.estimate is not None:
        hollow = series % len(SERIES) != 0
        shape, size = SHAPES[series % len(SHAPES)], 8.0 if series == 0 else 7.0
        fill = PAPER if hollow else FIRST
        sheet.paint(marker(axis.at(mark.estimate), middle, shape, size, colour, fill, 1.8))
    bottom = top + row.height - row.note_height
    for number, words in enumerate(row.note):
        sheet.text(0, bottom + 12 + 16.0 * number, words, size=SMALL, colour=MUTED)


def _interval(sheet: Sheet, mark: EstimateMark, axis: _Axis, middle: float, colour: str) -> None:
    """The interval's bar; an arrow where it goes on past the axis or has no limit."""
    beyond_left = mark.lower is None or mark.lower < axis.low
    beyond_right = mark.upper is None or mark.upper > axis.high
    start = axis.left if beyond_left else axis.at(mark.lower or axis.low)
    stop = axis.right if beyond_right else axis.at(mark.upper or axis.high)
    sheet.line([start, stop], [middle, middle], colour, width=2.2, butt=True)
    for end, beyond, away in ((start, beyond_left, -1.0), (stop, beyond_right, 1.0)):
        if beyond:
            tip = [end - 6.0 * away, end, end - 6.0 * away]
            sheet.line(tip, [middle - 4.5, middle, middle + 4.5], colour, width=2.0)
        else:
            sheet.line([end, end], [middle - 4.0, middle + 4.0], colour, width=1.8)
