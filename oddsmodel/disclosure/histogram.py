"""Bins of a histogram with small counts withheld."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from oddsmodel.disclosure.suppression import Suppression
from oddsmodel.disclosure.system import CountSystem
from oddsmodel.results.figures import HistogramFigure


def coarsen_histogram(figure: HistogramFigure, threshold: int) -> tuple[HistogramFigure, int] | None:
    """Bins with small counts withheld, with others so that none follows from the group's total; and how many.

    None where a whole group has fewer records than the threshold.
    """
    series = []
    withheld = 0
    for name, counts in figure.series:
        known = [count or 0 for count in counts]
        if 0 < sum(known) < threshold:
            return None
        hidden = _hidden_parts(known, threshold)
        withheld += len(hidden)
        series.append((name, tuple(None if k in hidden else count for k, count in enumerate(counts))))
    return replace(figure, series=tuple(series)), withheld


def _hidden_parts(parts: Sequence[int], threshold: int) -> set[int]:
    """Positions of the parts to hide where their sum is known."""
    system = CountSystem()
    numbers = [system.add(part, ("part", k)) for k, part in enumerate(parts)]
    system.relate(numbers, system.add(sum(parts), locked=True))
    counts = system.freeze()
    hidden = Suppression(counts, threshold).run()
    return {k for k in range(len(parts)) if counts.places["part", k] in hidden}
