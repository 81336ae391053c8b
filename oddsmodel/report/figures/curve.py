"""Odds ratio along a number column: curve with band, straight line, reference value, and where the records lie."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, PAPER, RULE, SECOND, SMALL, WIDTH, Sheet
from oddsmodel.report.figures.lettering import fold
from oddsmodel.report.figures.scales import plain_labels, plain_ticks, ratio_label, ratio_range, ratio_ticks
from oddsmodel.results.figures import CurveFigure
from oddsmodel.wording import say

if TYPE_CHECKING:
    from matplotlib.axes import Axes

_LEFT, _WIDTH, _HEIGHT, _STRIP = 46.0, 326.0, 210.0, 46.0


def draw(figure: CurveFigure) -> Sheet:
    title = fold(figure.x_label, SMALL, _WIDTH)
    ring = {"linestyle": "", "marker": "o", "markerfacecolor": PAPER, "markersize": 7, "linewidth": 1}
    entries: list[tuple[str, str, dict[str, Any]]] = [
        (say("figure-curve"), FIRST, {}),
        (say("figure-straight"), SECOND, {"linestyle": (0, (5, 3))}),
        (say("figure-reference", value=plain_labels([figure.reference])[0]), INK, ring),
    ]
    top = Sheet.key_height(entries) + 30.0
    bottom = top + _HEIGHT + (_STRIP if figure.density else 0.0)
    sheet = Sheet(bottom + 28.0 + 16.0 * len(title))
    low, high = ratio_range((*figure.curve, *figure.straight), (*figure.lower, *figure.upper), beyond=4.0)
    axes = sheet.plot(_LEFT, top, _WIDTH, _HEIGHT)
    axes.set_yscale("log")
    axes.set_xlim(min(figure.x), max(figure.x))
    axes.set_ylim(low, high)
    ticks = ratio_ticks(low, high, _HEIGHT, apart=26.0)
    axes.set_yticks(ticks, labels=[ratio_label(tick) for tick in ticks])
    axes.set_yticks((), minor=True)
    axes.grid(axis="y", color=RULE, linewidth=0.6)
    axes.set_axisbelow(True)
    axes.axhline(1.0, color=MUTED, linewidth=1.4)
    axes.fill_between(figure.x, figure.lower, figure.upper, color=FIRST, alpha=0.16, linewidth=0)
    axes.plot(figure.x, figure.straight, color=SECOND, linewidth=1.8, linestyle=(0, (5, 3)))
    axes.plot(figure.x, figure.curve, color=FIRST, linewidth=2.4)
    axes.plot(
        [figure.reference],
        [1.0],
        color=INK,
        marker="o",
        markersize=7,
        markerfacecolor=PAPER,
        markeredgecolor=INK,
        zorder=5,
    )

    ticks = plain_ticks(min(figure.x), max(figure.x))
    labelled = _density(sheet, figure, top + _HEIGHT) if figure.density else axes
    labelled.set_xticks(ticks, labels=plain_labels(ticks))
    if labelled is not axes:
        axes.set_xticks(())
    sheet.key(entries)
    sheet.text(0, top - 8, say("figure-odds-ratio-log"), size=SMALL, colour=INK)
    for number, words in enumerate(title):
        sheet.text(min(_LEFT + _WIDTH, WIDTH), bottom + 36 + 16 * number, words, size=SMALL, ha="right")
    return sheet


def _density(sheet: Sheet, figure: CurveFigure, top: float) -> Axes:
    """Where the records lie: bars by bin, their heights records per unit of the column."""
    strip = sheet.plot(_LEFT, top, _WIDTH, _STRIP)
    lower, upper, records = (np.array(values, dtype=float) for values in zip(*figure.density, strict=True))
    share = np.nan_to_num(records) / np.maximum(upper - lower, 1e-300)
    strip.bar(lower, share, width=upper - lower, align="edge", color=MUTED, alpha=0.45, linewidth=0)
    strip.set_xlim(min(figure.x), max(figure.x))
    strip.set_ylim(0, max(float(share.max()), 1e-300) * 1.25)
    strip.set_yticks(())
    strip.spines["left"].set_visible(False)
    return strip
