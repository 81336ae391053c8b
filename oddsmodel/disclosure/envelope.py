"""Ordered values with their envelope, gathered until no point stands for a few patterns or records."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from oddsmodel.results.figures import EnvelopeFigure

FEWEST_POINTS = 5
DIGITS = 2


def coarsen_envelope(figure: EnvelopeFigure, threshold: int) -> EnvelopeFigure | None:
    """Neighbouring points merged, from the smallest on, until each stands for `threshold` patterns and records.

    What is left over at the top goes with the last. A merged point is the mean of its values, rounded, so that no
    single residual, from which a pattern's events could be worked out, is shown. None where fewer than five points
    remain.
    """
    runs: list[list[int]] = [[]]
    for k in range(len(figure.x)):
        if _enough(figure, runs[-1], threshold):
            runs.append([])
        runs[-1].append(k)
    if len(runs) > 1 and not _enough(figure, runs[-1], threshold):
        runs[-2].extend(runs.pop())
    if len(runs) < FEWEST_POINTS:
        return None

    def means(values: Sequence[float]) -> tuple[float, ...]:
        return tuple(
            round(sum(values[k] * figure.values[k] for k in run) / sum(figure.values[k] for k in run), DIGITS)
            for run in runs
        )

    return replace(
        figure,
        x=means(figure.x),
        observed=means(figure.observed),
        middle=means(figure.middle),
        lower=means(figure.lower),
        upper=means(figure.upper),
        values=tuple(sum(figure.values[k] for k in run) for run in runs),
        records=tuple(sum(figure.records[k] for k in run) for run in runs),
    )


def _enough(figure: EnvelopeFigure, run: Sequence[int], threshold: int) -> bool:
    return bool(run) and all(sum(counts[k] for k in run) >= threshold for counts in (figure.values, figure.records))
