"""A plot on a sheet: a bare frame of two quiet rules with ticks outside, and what is drawn inside cut at the edges."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from html import escape

import numpy as np
from numpy.typing import ArrayLike, NDArray

from oddsmodel.report.figures.canvas import MUTED, RULE, SMALL, Anchor, Sheet, Window
from oddsmodel.report.figures.strokes import Dashes, number, outline, path, stroke, wash

_FAR = 20_000.0
"""As far off the sheet as a browser draws well; what lies farther is moved here."""
_TICK = 4.0
_FRAME = 0.8
_GRID = 0.6


@dataclass(frozen=True, slots=True)
class Scale:
    """Values from `low` to `high` stand at positions from `start` to `stop` of the sheet."""

    low: float
    high: float
    start: float
    stop: float
    log: bool = False

    def at(self, values: ArrayLike) -> NDArray[np.float64]:
        """The position (n,) of each value (n,)."""
        at, low, high = np.asarray(values, dtype=float), self.low, self.high
        if self.log:
            at, low, high = np.log(np.maximum(at, 1e-300)), math.log(low), math.log(high)
        with np.errstate(over="ignore"):
            share = (at - low) / ((high - low) or 1.0)
            return np.clip(self.start + share * (self.stop - self.start), -_FAR, _FAR)


class Plot:
    """A rectangle of a sheet with a scale across and one upwards. Its axes come before what stands inside it."""

    def __init__(
        self,
        sheet: Sheet,
        left: float,
        top: float,
        width: float,
        height: float,
        *,
        x: tuple[float, float],
        y: tuple[float, float],
        log: bool = False,
    ) -> None:
        """Values from x[0] to x[1] across and from y[0] to y[1] upwards, where `log` makes a log axis."""
        self.x = Scale(*x, left, left + width)
        self.y = Scale(*y, top + height, top, log)
        self._sheet = sheet
        self._window = Window(left, top, width, height)

    def bottom_axis(self, ticks: Sequence[float] = (), labels: Sequence[str] = (), *, grid: bool = False) -> None:
        """The rule along the bottom, with ticks and their labels below, and quiet rules upwards where `grid`."""
        bottom, top = number(self.y.start), number(self.y.stop)
        at = self.x.at(ticks).tolist()
        if grid:
            self._strokes([f"M{number(x)} {bottom}V{top}" for x in at], RULE, _GRID)
        self._sheet.line([self.x.start, self.x.stop], [self.y.start] * 2, RULE, width=_FRAME)
        self._strokes([f"M{number(x)} {bottom}v{_TICK:g}" for x in at], MUTED, _FRAME)
        self._labels([(x, self.y.start + 17.2) for x in at], labels, "middle")

    def left_axis(self, ticks: Sequence[float], labels: Sequence[str]) -> None:
        """The rule along the left, with ticks and their labels beside it, and quiet rules across."""
        left, right = number(self.x.start), number(self.x.stop)
        at = self.y.at(ticks).tolist()
        self._strokes([f"M{left} {number(y)}H{right}" for y in at], RULE, _GRID)
        self._sheet.line([self.x.start] * 2, [self.y.start, self.y.stop], RULE, width=_FRAME)
        self._strokes([f"M{left} {number(y)}h-{_TICK:g}" for y in at], MUTED, _FRAME)
        self._labels([(self.x.start - 7.5, y + 4.85) for y in at], labels, "end")

    def line(self, x: ArrayLike, y: ArrayLike, colour: str, *, width: float, dashes: Dashes = ()) -> None:
        """A line through points (n,), (n,)."""
        self.put(stroke(path(self.x.at(x).tolist(), self.y.at(y).tolist()), colour, width, dashes))

    def level(self, y: float, colour: str, *, width: float, dashes: Dashes = ()) -> None:
        """A line across the whole plot."""
        self.line([self.x.low, self.x.high], [y, y], colour, width=width, dashes=dashes)

    def between(self, x: ArrayLike, lower: ArrayLike, upper: ArrayLike, colour: str, opacity: float) -> None:
        """What lies between two lines over the same x (n,)."""
        across = self.x.at(x)
        data = outline(
            np.concatenate([across, across[::-1]]).tolist(),
            np.concatenate([self.y.at(upper), self.y.at(lower)[::-1]]).tolist(),
        )
        self.put(wash(data, colour, opacity))

    def put(self, element: str) -> None:
        """An SVG element in positions of the sheet, cut at the edges of the plot."""
        if not self._window.elements:
            self._sheet.paint(self._window)
        self._window.elements.append(element)

    def _strokes(self, pieces: list[str], colour: str, width: float) -> None:
        if pieces:
            self._sheet.paint(stroke("".join(pieces), colour, width, butt=True))

    def _labels(self, places: list[tuple[float, float]], labels: Sequence[str], anchor: Anchor) -> None:
        words = "".join(
            f'<text x="{number(x)}" y="{number(y)}">{escape(label, quote=False)}</text>'
            for (x, y), label in zip(places, labels, strict=True)
        )
        if words:
            style = f"font-size:{SMALL:g}px;text-anchor:{anchor};fill:{MUTED}"
            self._sheet.paint(f'<g style="{style}">{words}</g>')
