"""Observed share against predicted risk: groups with intervals, a smooth curve, and the line of agreement."""

from __future__ import annotations

from typing import Any

from oddsmodel.report.figures.canvas import FIRST, INK, MUTED, PAPER, RULE, SECOND, SMALL, Sheet
from oddsmodel.report.figures.scales import percent_labels, plain_ticks
from oddsmodel.results.figures import CalibrationFigure
from oddsmodel.wording import say

_LEFT, _SIDE = 48.0, 318.0


def draw(figure: CalibrationFigure) -> Sheet:
    entries: list[tuple[str, str, dict[str, Any]]] = [
        (say("figure-agreement"), MUTED, {"linewidth": 1.2, "linestyle": (0, (4, 3))})
    ]
    if figure.groups:
        ring = {"linestyle": "", "marker": "o", "markerfacecolor": PAPER, "markeredgewidth": 1.8}
        entries.append((say("figure-groups"), SECOND, ring))
    if figure.smooth:
        entries.append((say("figure-smooth"), FIRST, {}))
    top = Sheet.key_height(entries) + 30.0
    sheet = Sheet(top + _SIDE + 50.0)
    sheet.key(entries)

    highest = _highest(figure)
    axes = sheet.plot(_LEFT, top, _SIDE, _SIDE)
    axes.set_xlim(0, highest)
    axes.set_ylim(0, highest)
    ticks = plain_ticks(0.0, highest)
    axes.set_xticks(ticks, labels=percent_labels(ticks))
    axes.set_yticks(ticks, labels=percent_labels(ticks))
    axes.plot([0, highest], [0, highest], color=MUTED, linewidth=1.2, linestyle=(0, (4, 3)))
    for group in figure.groups:
        axes.plot([group.predicted] * 2, [group.lower, group.upper], color=SECOND, linewidth=1.6, zorder=3)
    axes.plot(
        [group.predicted for group in figure.groups],
        [group.observed for group in figure.groups],
        linestyle="",
        marker="o",
        markersize=7,
        markerfacecolor=PAPER,
        markeredgecolor=SECOND,
        markeredgewidth=1.8,
        zorder=4,
    )
    if figure.smooth:
        axes.plot(*zip(*figure.smooth, strict=True), color=FIRST, linewidth=2.2, zorder=2)
    sheet.text(0, top - 10, say("figure-observed-share"), size=SMALL, colour=INK)
    sheet.text(_LEFT + _SIDE, top + _SIDE + 42, say("figure-predicted-risk"), size=SMALL, colour=INK, ha="right")
    axes.grid(color=RULE, linewidth=0.6)
    axes.set_axisbelow(True)
    return sheet


def _highest(figure: CalibrationFigure) -> float:
    values = [value for group in figure.groups for value in (group.predicted, group.upper)]
    values += [value for point in figure.smooth for value in point]
    return min(1.0, 1.06 * max(values, default=1.0)) or 1.0
