"""The sheet every figure is drawn on: an SVG in plain units, one unit a CSS pixel, positions from the top left.

Colours are CSS variables of the page, so that a figure follows light and dark.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from html import escape
from typing import Literal

from oddsmodel.report.figures.lettering import width_of
from oddsmodel.report.figures.strokes import Dashes, marker, number, path, stroke
from oddsmodel.wording.plain import plain

WIDTH = 380.0
TEXT = 13.5
SMALL = 12.75
LINE = 17.0

INK = "var(--ink)"
MUTED = "var(--muted)"
RULE = "var(--rule)"
FIRST = "var(--first)"
SECOND = "var(--second)"
THIRD = "var(--third)"
FOURTH = "var(--fourth)"
PAPER = "var(--paper)"
SERIES = (FIRST, SECOND, THIRD, FOURTH)

Anchor = Literal["start", "middle", "end"]

RING = 7.0
_KEY_GAP = 14.0


@dataclass(frozen=True, slots=True)
class KeyEntry:
    """Words of a key beside a sample: a stretch of line, or a ring; `stroke` is how wide it is drawn."""

    words: str
    colour: str
    dashes: Dashes = ()
    ring: bool = False
    stroke: float = 2.0

    @property
    def width(self) -> float:
        return 24.0 + width_of(plain(self.words), SMALL) + _KEY_GAP


@dataclass(frozen=True, slots=True)
class Window:
    """A rectangle of a sheet whose elements are cut at its edges."""

    left: float
    top: float
    width: float
    height: float
    elements: list[str] = field(default_factory=list)

    def svg(self, id_: str) -> str:
        sides = (("x", self.left), ("y", self.top), ("width", self.width), ("height", self.height))
        rectangle = " ".join(f'{name}="{number(value)}"' for name, value in sides)
        clip = f'<clipPath id="{id_}"><rect {rectangle}/></clipPath>'
        return f'{clip}<g clip-path="url(#{id_})">{"".join(self.elements)}</g>'


class Sheet:
    """A drawing of `WIDTH` by `height` units, painted in the order of the calls."""

    def __init__(self, height: float) -> None:
        self.height = height
        self._painted: list[str | Window] = []

    def paint(self, element: str | Window) -> None:
        """An SVG element as it stands, every text in it escaped, or a window that may be filled later."""
        self._painted.append(element)

    def text(
        self,
        x: float,
        y: float,
        text: str,
        *,
        size: float = TEXT,
        colour: str = INK,
        anchor: Anchor = "start",
        bold: bool = False,
    ) -> None:
        """Text whose baseline begins (or is centred, or ends: `anchor`) at a position of the sheet."""
        weight = "font-weight:700;" if bold else ""
        place = "" if anchor == "start" else f"text-anchor:{anchor};"
        style = f"{weight}font-size:{size:g}px;{place}fill:{colour}"
        self.paint(f'<text x="{number(x)}" y="{number(y)}" style="{style}">{escape(plain(text), quote=False)}</text>')

    def line(
        self,
        x: Sequence[float],
        y: Sequence[float],
        colour: str = INK,
        *,
        width: float = 1.2,
        dashes: Dashes = (),
        butt: bool = False,
    ) -> None:
        self.paint(stroke(path(x, y), colour, width, dashes, butt=butt))

    def key(self, entries: Sequence[KeyEntry]) -> None:
        """A key in one or more rows at the top."""
        x, baseline = 0.0, 14.0
        for entry in entries:
            if x > 0 and x + entry.width > WIDTH + _KEY_GAP:
                x, baseline = 0.0, baseline + LINE
            if entry.ring:
                self.paint(marker(x + 9, baseline - 4, "circle", RING, entry.colour, PAPER, entry.stroke))
            else:
                self.line([x, x + 18], [baseline - 4] * 2, entry.colour, width=entry.stroke, dashes=entry.dashes)
            self.text(x + 24, baseline, entry.words, size=SMALL, colour=MUTED)
            x += entry.width

    @staticmethod
    def key_height(entries: Sequence[KeyEntry]) -> float:
        """The height of a key over the whole width of a sheet."""
        rows, x = 1, 0.0
        for entry in entries:
            if x > 0 and x + entry.width > WIDTH + _KEY_GAP:
                rows, x = rows + 1, 0.0
            x += entry.width
        return LINE * rows

    def svg(self, prefix: str, title: str, alt: str) -> str:
        """The sheet as an inline element of a page.

        `prefix` makes every id of the drawing unique in the page. `title` and `alt` become its name and description.
        """
        named = "".join(
            f'<{name} id="{prefix}-{name}">{escape(plain(words), quote=False)}</{name}>'
            for name, words in (("title", title), ("desc", alt))
        )
        painted = "".join(
            element.svg(f"{prefix}-{place}") if isinstance(element, Window) else element
            for place, element in enumerate(self._painted)
        )
        return (
            f'<svg viewBox="0 0 {number(WIDTH)} {number(self.height)}" role="img" '
            f'aria-labelledby="{prefix}-title {prefix}-desc" class="drawing" focusable="false">{named}{painted}</svg>'
        )
