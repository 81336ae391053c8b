"""The sheet every figure is drawn on: matplotlib in plain units, one point a CSS pixel.

Colours are drawn as stand-ins and become CSS variables of the page, so that a figure follows light and dark.
"""

from __future__ import annotations

import io
import warnings
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

from oddsmodel.report.figures.lettering import width_of
from oddsmodel.wording.plain import plain

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure as Drawing

WIDTH = 380.0
TEXT = 13.5
SMALL = 12.75
LINE = 17.0

INK = "#010101"
MUTED = "#010102"
RULE = "#010103"
FIRST = "#010104"
SECOND = "#010105"
THIRD = "#010106"
FOURTH = "#010107"
PAPER = "#010108"
SERIES = (FIRST, SECOND, THIRD, FOURTH)
MARKERS = ("o", "s", "D", "^")
VARIABLES = {
    INK: "var(--ink)",
    MUTED: "var(--muted)",
    RULE: "var(--rule)",
    FIRST: "var(--first)",
    SECOND: "var(--second)",
    THIRD: "var(--third)",
    FOURTH: "var(--fourth)",
    PAPER: "var(--paper)",
}

_SETTINGS: dict[str, Any] = {
    "svg.hashsalt": "oddsmodel",
    "svg.fonttype": "none",
    "svg.image_inline": True,
    "text.parse_math": False,
    "text.usetex": False,
    "axes.unicode_minus": True,
    "font.family": "sans-serif",
    "font.size": SMALL,
    "path.simplify": True,
}
_KEY_GAP = 14.0


def _key_width(words: str) -> float:
    return 24.0 + width_of(plain(words), SMALL) + _KEY_GAP


class Sheet:
    """A drawing of `width` by `height` units. Positions are from the top left, as on a page."""

    def __init__(self, height: float, width: float = WIDTH) -> None:
        from matplotlib.backends.backend_svg import FigureCanvasSVG
        from matplotlib.figure import Figure as Drawing

        self.width = width
        self.height = height
        self.drawing: Drawing = Drawing(figsize=(width / 72, height / 72), dpi=72)
        self.drawing.patch.set_visible(False)
        FigureCanvasSVG(self.drawing)
        self._page: Axes | None = None

    @property
    def page(self) -> Axes:
        """Axes over the whole sheet in its own units, y growing downwards, nothing drawn of themselves."""
        if self._page is None:
            self._page = self.drawing.add_axes((0, 0, 1, 1))
            self._page.set_axis_off()
            self._page.set_xlim(0, self.width)
            self._page.set_ylim(self.height, 0)
        return self._page

    def plot(self, left: float, top: float, width: float, height: float) -> Axes:
        """Axes with ticks in a rectangle of the sheet: a bare frame of two quiet rules."""
        axes = self.drawing.add_axes(
            (left / self.width, 1 - (top + height) / self.height, width / self.width, height / self.height)
        )
        axes.patch.set_visible(False)
        for side in ("top", "right"):
            axes.spines[side].set_visible(False)
        for side in ("left", "bottom"):
            axes.spines[side].set_color(RULE)
        axes.tick_params(colors=MUTED, labelcolor=MUTED, labelsize=SMALL, length=4, width=0.8)
        return axes

    def text(self, x: float, y: float, text: str, *, size: float = TEXT, colour: str = INK, **style: Any) -> None:
        """Text whose baseline begins (or ends, or is centred: `ha`) at a position of the sheet."""
        self.page.text(x, y, plain(text), fontsize=size, color=colour, va=style.pop("va", "baseline"), **style)

    def line(self, x: Sequence[float], y: Sequence[float], colour: str = INK, **style: Any) -> None:
        self.page.plot(x, y, color=colour, linewidth=style.pop("linewidth", 1.2), **style)

    def key(self, entries: Sequence[tuple[str, str, dict[str, Any]]]) -> None:
        """A key in one or more rows at the top: (words, colour, how its sample is drawn)."""
        x, baseline = 0.0, 14.0
        for words, colour, style in entries:
            need = _key_width(words)
            if x > 0 and x + need > self.width + _KEY_GAP:
                x, baseline = 0.0, baseline + LINE
            drawn = {"linewidth": 2.0, **style}
            xs = [x + 9] if drawn.get("marker") and drawn.get("linestyle") == "" else [x, x + 18]
            self.page.plot(xs, [baseline - 4] * len(xs), color=colour, **drawn)
            self.text(x + 24, baseline, words, size=SMALL, colour=MUTED)
            x += need

    @staticmethod
    def key_height(entries: Sequence[tuple[str, str, dict[str, Any]]]) -> float:
        """The height of a key over the whole width of a sheet."""
        rows, x = 1, 0.0
        for words, _, _ in entries:
            need = _key_width(words)
            if x > 0 and x + need > WIDTH + _KEY_GAP:
                rows, x = rows + 1, 0.0
            x += need
        return LINE * rows

    def source(self) -> str:
        """The SVG as matplotlib writes it."""
        written = io.StringIO()
        self.drawing.savefig(written, format="svg", metadata={"Date": None, "Creator": None}, transparent=True)
        return written.getvalue()


@contextmanager
def drawing_settings() -> Iterator[None]:
    """Own settings for a drawing, whatever a caller has set; a glyph that is not in matplotlib's own font is no fault,
    since the reader's browser draws the text."""
    from matplotlib import rc_context, rcParamsDefault

    kept = ("backend", "toolbar", "interactive", "figure.hooks")
    settings: Any = {name: value for name, value in rcParamsDefault.items() if not name.startswith(kept)} | _SETTINGS
    with warnings.catch_warnings(), rc_context(settings):
        warnings.simplefilter("ignore")
        yield
