"""The picture of a curve beside the straight line: odds ratio against value, with where the records lie."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from oddsmodel.checks.curves import Line
from oddsmodel.errors import InputFault
from oddsmodel.measures.wald import normal_quantile
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.figures import CurveFigure

GRID = 101
BINS = 20
LONGEST_WHOLE_GRID = 200
LARGEST_DRAWN_LOG = 12.0
MOST_STEPS = 4096

LogOdds = Callable[[Array, float], tuple[Array, Array]]
"""Log odds at values (g,) relative to a reference, and their standard errors (g,)."""


def odds_curve(
    model: FittedModel, line: Line, log_odds: LogOdds, *, identity: str, title: str, alt: str
) -> CurveFigure | None:
    """Odds ratio against the column's value, relative to the median, over the middle 95% of the records."""
    steady = _steady(model, line)
    spread, axis = (line.own, line.axis) if steady else (line.entered, line.label)
    whole = bool((spread.values == np.rint(spread.values)).all())
    lower, reference, upper = spread.quantiles((0.025, 0.5, 0.975)).tolist()
    if not lower < upper:
        return None
    grid = np.linspace(lower, upper, GRID)
    if whole and upper - lower <= LONGEST_WHOLE_GRID:
        lower, upper = math.floor(lower), math.ceil(upper)
        grid = np.arange(lower, upper + 1.0)
    at = _entered(model, line, np.append(grid, reference)) if steady else np.append(grid, reference)
    if at is None:
        return None
    entered_grid, entered_reference = at[:-1], float(at[-1])
    curve, error = log_odds(entered_grid, entered_reference)
    half = normal_quantile(model.level) * error
    straight = model.fit.coefficients[line.position] * (entered_grid - entered_reference)
    drawn = np.stack([curve, curve - half, curve + half, straight])
    if not np.abs(drawn).max() <= LARGEST_DRAWN_LOG:
        return None
    ratios = [tuple(row) for row in np.exp(drawn).tolist()]
    edges = bin_edges(lower, upper, whole=whole)
    records = np.rint(spread.in_bins(edges)).astype(int)
    return CurveFigure(
        id=identity,
        title=title,
        alt=alt,
        x_label=axis,
        x=tuple(grid.tolist()),
        curve=ratios[0],
        lower=ratios[1],
        upper=ratios[2],
        straight=ratios[3],
        reference=reference,
        density=tuple(zip(edges[:-1].tolist(), edges[1:].tolist(), records.tolist(), strict=True)),
    )


def _steady(model: FittedModel, line: Line) -> bool:
    """Whether what entered the model rises or falls steadily with the record column's values."""
    own = line.own.values
    if own.size > MOST_STEPS:
        own = own[np.linspace(0, own.size - 1, MOST_STEPS).astype(int)]
    entered = _entered(model, line, own)
    if entered is None:
        return False
    steps = np.diff(entered)
    return bool((steps >= 0).all() or (steps <= 0).all())


def _entered(model: FittedModel, line: Line, own: Array) -> Array | None:
    """What values (g,) of the record column become in the model matrix (g,); None where one has no place there."""
    if line.own is line.entered:
        return own
    record = model.rows.columns_at(np.zeros(1, dtype=np.int64))
    records = record.iloc[np.zeros(own.size, dtype=int)].assign(**{line.source: own})
    try:
        return model.design.encode(records)[:, line.position]
    except InputFault:
        return None


def bin_edges(lower: float, upper: float, *, whole: bool) -> Array:
    """About `BINS` bins of a round width over lower..upper, around whole numbers where the values are whole."""
    rough = (upper - lower) / BINS
    power = 10.0 ** math.floor(math.log10(rough))
    width = next(step * power for step in (1.0, 2.0, 2.5, 5.0, 10.0) if step * power >= rough * (1 - 1e-9))
    if whole:
        width = max(1.0, float(math.ceil(width)))
        first = math.floor(lower)
        return np.arange(first, math.floor(upper) + 1 + width, width) - 0.5
    first = math.floor(lower / width)
    return np.asarray(np.arange(first, math.ceil(upper / width) + 1) * width)
