"""The constant that a formula without an intercept holds all the same."""

from __future__ import annotations

from oddsmodel.design.encoder import Design


def indicators_of_all_levels(design: Design) -> tuple[int, ...]:
    """The positions of the indicators of a column's levels where every level has one: they add up to one.

    Empty where the formula has an intercept, or where no column has an indicator for every level.
    """
    if any(column.kind == "intercept" for column in design.columns):
        return ()
    for term in design.terms:
        own = range(term.start, term.stop)
        if all(design.columns[i].kind == "level" and design.columns[i].reference is None for i in own):
            return tuple(own)
    return ()
