"""The straight lines of untransformed numbers, and why powers cannot be set against a line."""

from __future__ import annotations

from oddsmodel.checks.curves import FEWEST_VALUES, Line, straight_lines
from oddsmodel.checks.power_fits import constant_columns
from oddsmodel.checks.powers import Origin
from oddsmodel.model.fitted import FittedModel

A_FEW = 20
"""What lies so close to the smallest value of a column that its shift tells it must be this many records."""

Withheld = tuple[Line, str]
"""A line and the code of why nothing is set against it."""


def rarer_outcome(model: FittedModel) -> int:
    """Records with the event or without, whichever are fewer."""
    return min(model.events, model.records - model.events)


def no_powers(model: FittedModel, least: int) -> str | None:
    """The code of why powers are set against no line of a model at all; least: events, and records without one."""
    if model.grouping is not None:
        return "no-check-of-grouped-records"
    if not constant_columns(model):
        return "powers-no-constant"
    if rarer_outcome(model) < least:
        return "powers-few-events"
    return None


def number_lines(model: FittedModel) -> tuple[list[Line], list[Withheld]]:
    """Lines of numbers of at least five values that enter as they are, and those of other columns."""
    lines: list[Line] = []
    withheld: list[Withheld] = []
    for line in straight_lines(model):
        if model.design.columns[line.position].kind != "number":
            withheld.append((line, "powers-of-a-function"))
        elif line.entered.values.size < FEWEST_VALUES:
            withheld.append((line, "powers-few-values"))
        else:
            lines.append(line)
    return lines, withheld


def told_shift(line: Line, origin: Origin) -> float | None:
    """The shift of a column; None where it would tell the smallest value of a few records."""
    spread = line.entered
    if origin.shift == 0.0:
        return 0.0
    near = spread.values <= spread.values[0] + 0.5 * (spread.values[0] + origin.shift)
    return origin.shift if float(spread.counts[near].sum()) >= A_FEW else None
