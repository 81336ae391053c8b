"""Cross-counts of derived columns, made so coarse that they give no small count away."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import replace

from oddsmodel.disclosure.hiding import Hiding
from oddsmodel.results.derived import DerivedColumn, DerivedCount

ROUNDED_TO = 10
STEPS = 20
"""The range of a column is told in about this many steps."""


def disclosed_derived(column: DerivedColumn, hiding: Hiding) -> DerivedColumn:
    """Counts under the threshold hidden, the others rounded; smallest and largest values rounded outwards.

    The counts are of all records read, and others in the report of those analysed: their difference would count the
    few who were left out. They are rounded to a multiple of 10, or of twice the threshold where that is more, so that
    such a difference is never known to be small. No extreme value of one record is shown, but one of 20 steps.
    """
    if hiding.threshold < 2:
        return column
    base = max(ROUNDED_TO, 2 * hiding.threshold)
    steps = {source: _step(one for one in column.counts if one.source == source) for source in _sources(column)}
    counts = tuple(_count(one, base, steps[one.source], hiding) for one in column.counts)
    return replace(column, counts=counts, rounded_to=base)


def _sources(column: DerivedColumn) -> set[str]:
    return {one.source for one in column.counts}


def _count(one: DerivedCount, base: int, step: float, hiding: Hiding) -> DerivedCount:
    if one.records is None or one.records == 0:
        return one
    if one.records < hiding.threshold:
        hiding.taken += 1
        return replace(one, records=None, smallest=None, largest=None)
    smallest, largest = one.smallest, one.largest
    if smallest is not None and largest is not None and step > 0.0:
        smallest, largest = math.floor(smallest / step) * step, math.ceil(largest / step) * step
        smallest = smallest if one.lower is None else max(smallest, one.lower)
        largest = largest if one.upper is None else min(largest, one.upper)
        smallest, largest = float(f"{smallest:.6g}"), float(f"{largest:.6g}")
    return replace(one, records=base * max(math.floor(one.records / base + 0.5), 1), smallest=smallest, largest=largest)


def _step(counts: Iterable[DerivedCount]) -> float:
    """The step in which a column's values are told: 1, 2 or 5 times a power of ten, at least 1/20 of its range.

    0 where every record has the same value, which then tells of no one record.
    """
    ends = [end for one in counts for end in (one.smallest, one.largest) if end is not None]
    width = (max(ends) - min(ends)) / STEPS if ends else 0.0
    if width == 0.0:
        return 0.0
    power = 10.0 ** math.floor(math.log10(width))
    return next(power * times for times in (1, 2, 5, 10) if power * times >= width * (1 - 1e-12))
