"""Groups of about equal size, cut at the quantiles of a number among the records kept."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from oddsmodel.errors import InputFault
from oddsmodel.plan.band_names import band_names, edge_text
from oddsmodel.records.derived.making import Array, Made, Making, number_values, with_levels
from oddsmodel.records.faults import fault
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

FINE = 1000
"""Cut points are rounded to less than this part of the spread before they cut: what is told is what was used."""


def quantile_groups(making: Making) -> Made:
    """An ordered column of groups cut at the quantiles 1/g, …, (g - 1)/g of the source.

    The quantiles are those of the records that the plan keeps and that have the value, each row counted as often as
    its count says, by definition 7 of Hyndman & Fan (1996), and rounded (`cut_points`). A group holds its lower cut
    point. Cut points that fall together, or on the smallest value, make fewer groups, which is told.

    Raises: InputFault where the source is no number, or no cut point is left.
    """
    source, number = making.sources[0], making.section.groups
    asked = number if isinstance(number, int) else 0
    values = number_values(making, source)
    used = making.kept & ~np.isnan(values) & (making.weights > 0)
    cuts = cut_points(values[used], making.weights[used], asked)
    if not cuts:
        raise InputFault(fault("derived-no-cut-point", making.where, source=quoted(source.column.name), groups=asked))
    levels = band_names(cuts)
    position = np.searchsorted(np.asarray(cuts), values, side="right")
    codes = np.where(np.isnan(values), -1, position).astype(np.intp)
    coded = with_levels(making, "ordered", levels, codes)
    facts = {"column": making.name, "source": source.column.name, "cuts": [edge_text(cut) for cut in cuts]}
    told = [finding("note", "quantile-cuts", **facts)]
    if len(levels) < asked:
        told.append(finding("caution", "quantile-fewer-groups", **facts, asked=asked, groups=len(levels)))
    coded = replace(coded, findings=(*coded.findings, *told))
    return Made(coded, cuts)


def cut_points(values: Array, weights: Array, groups: int) -> tuple[float, ...]:
    """The rounded quantiles (at most groups - 1) of values (k,) that each stand weights (k,) times, all different and
    above the smallest value.

    Definition 7 of Hyndman & Fan (1996): with N values in order, the quantile p lies at place 1 + (N - 1)p, between two
    neighbours in proportion. Rounded to as many decimals as it takes for a thousandth of the spread between the 5% and
    the 95% quantile.
    """
    if len(values) == 0:
        return ()
    order = np.argsort(values, kind="stable")
    values, last = values[order], np.cumsum(weights[order])
    cuts = _quantiles(values, last, np.arange(1, groups) / groups)
    spread = float(np.subtract(*_quantiles(values, last, np.asarray([0.95, 0.05]))))
    decimals = math.ceil(math.log10(FINE / spread)) if spread > 0.0 else 6
    rounded = [round(float(cut), decimals) for cut in cuts]
    return tuple(cut for cut in dict.fromkeys(rounded) if cut > values[0])


def _quantiles(values: Array, last: Array, shares: Array) -> Array:
    """Quantiles of values in order (k,), of which last (k,) counts the records up to each."""
    place = (last[-1] - 1.0) * shares
    below = np.floor(place)
    lower, upper = (values[np.searchsorted(last, at, side="right")] for at in (below, np.ceil(place)))
    found: Array = lower + (place - below) * (upper - lower)
    return found
