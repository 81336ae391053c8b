"""Who the records are: each column summarised by group, with standardised differences and no tests."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.measures.counts import level_codes, whole
from oddsmodel.measures.groups import Groups, groups_of_study
from oddsmodel.measures.standardised_difference import (
    standardised_difference_of_means,
    standardised_difference_of_shares,
)
from oddsmodel.model.kept import KeptRecords
from oddsmodel.records.types import Column
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say
from oddsmodel.wording.numbers import decimal, percent

Array = NDArray[np.float64]

SKEWED = 1.0
"""Above this skewness, either way, a number column is told by its median and quartiles."""


@dataclass(frozen=True, slots=True)
class _Line:
    """One row before it is laid out: a count and a summary for each group, and a standardised difference."""

    label: str
    records: NDArray[np.int64]
    summaries: Sequence[str | None]
    difference: float | None = None


def study_characteristics(
    study_design: str,
    kept: KeptRecords,
    columns: Mapping[str, Column],
    exposures: Sequence[str],
    adjustment: Sequence[str],
    analysed: NDArray[np.bool_],
) -> Table:
    """The characteristics of a study: by case status in a case-control study, else by its first exposure.

    kept: the n records that belong to the study and have outcome and exposures; analysed (n,): those the model uses.
    """
    groups = groups_of_study(study_design, columns[exposures[0]], kept.frame, kept.event, kept.counts)
    names = tuple(dict.fromkeys((*exposures, *adjustment)))
    return characteristics(kept.frame, columns, names, groups, analysed=analysed, counts=kept.counts)


def characteristics(
    frame: pd.DataFrame,
    columns: Mapping[str, Column],
    names: Sequence[str],
    groups: Groups,
    *,
    analysed: NDArray[np.bool_] | None = None,
    counts: Array | None = None,
) -> Table:
    """The table "who they were".

    frame: the n records that belong to the study and have outcome and exposure. names: the columns to describe;
    identifiers, dates and the column that makes the groups are passed over. groups: of the n records.
    analysed (n,): the records that the model uses, all of them where None. counts (n,): true frequencies.

    Everything is computed on the records analysed, but for the lines "not recorded", which count all n records.
    A number column is told by mean and standard deviation, or by median and quartiles where the skewness
    m3 / m2^(3/2) over all groups is above 1 either way; its standardised difference is always that of the means
    (Austin 2009). Levels are told by count and share; their standardised difference is the multivariate one of all
    levels (Yang & Dalton 2012). With more than two groups the largest difference of any two is given.
    """
    analysed = np.ones(len(frame), dtype=bool) if analysed is None else analysed
    weight = np.ones(len(frame)) if counts is None else counts
    whole_table = {name: Described(frame[name], groups.codes, analysed, weight) for name in names if name in frame}
    everyone = Described(pd.Series(analysed), groups.codes, analysed, weight)
    return characteristics_of(everyone, whole_table.__getitem__, columns, names, groups)


@dataclass(frozen=True, slots=True)
class Described:
    """One column of the records to be described, whole or counted by its values: all (j,).

    values: of the column. group: the group of each, -1 for none. analysed: whether the model uses them. weight: how
    many records each stands for.
    """

    values: pd.Series
    group: NDArray[np.int64]
    analysed: NDArray[np.bool_]
    weight: Array


def characteristics_of(
    everyone: Described,
    described: Callable[[str], Described],
    columns: Mapping[str, Column],
    names: Sequence[str],
    groups: Groups,
) -> Table:
    """See `characteristics`; everyone: the records, whatever their values; described: one column at a time."""
    size = len(groups.labels)
    used = everyone.analysed & (everyone.group >= 0)
    totals = np.bincount(everyone.group[used], weights=everyone.weight[used], minlength=size)
    blocks: list[list[_Line]] = [[_Line(say("row-records"), whole(totals), [None] * size)]]
    without_spread: list[str] = []
    for name in names:
        column = columns[name]
        if name == groups.by or column.kind in ("identifier", "date"):
            continue
        one = described(name)
        used = one.analysed & (one.group >= 0)
        if column.levels:
            codes = level_codes(one.values, column.levels)
            recorded = codes >= 0
            lines = _level_lines(column, codes, one.group, one.weight, used & recorded, size)
        else:
            values = one.values.to_numpy(dtype=np.float64)
            recorded = np.isfinite(values)
            lines = [_number_line(column, values, one.group, one.weight, used & recorded, size)]
        if size > 1 and lines[0].difference is None:
            without_spread.append(column.label)
        blocks.append(lines)
        blocks += _not_recorded(column, recorded, one.group, one.weight, size)
    return _laid_out(groups, blocks, without_spread)


def _level_lines(
    column: Column,
    codes: NDArray[np.int64],
    group: NDArray[np.int64],
    weight: Array,
    used: NDArray[np.bool_],
    size: int,
) -> list[_Line]:
    k = len(column.levels)
    cells = np.bincount(group[used] * k + codes[used], weights=weight[used], minlength=size * k).reshape(size, k)
    totals = cells.sum(axis=1, keepdims=True)
    shares = np.divide(cells, totals, out=np.zeros(cells.shape), where=totals > 0)
    filled = [g for g in range(size) if totals[g, 0] > 0]
    pairs = [standardised_difference_of_shares(shares[g], shares[h]) for g, h in combinations(filled, 2)]
    return [
        _Line(
            f"{column.label}: {level}",
            whole(cells[:, position]),
            [percent(float(shares[g, position])) if g in filled else None for g in range(size)],
            _largest(pairs) if position == 0 else None,
        )
        for position, level in enumerate(column.levels)
    ]


def _number_line(
    column: Column,
    values: Array,
    group: NDArray[np.int64],
    weight: Array,
    used: NDArray[np.bool_],
    size: int,
) -> _Line:
    x, g, w = values[used], group[used], weight[used]
    number = np.bincount(g, weights=w, minlength=size)
    filled = [k for k in range(size) if number[k] > 0]
    mean = np.divide(np.bincount(g, weights=w * x, minlength=size), number, out=np.zeros(size), where=number > 0)
    squares = np.bincount(g, weights=w * (x - mean[g]) ** 2, minlength=size)
    variance = np.divide(squares, number - 1, out=np.zeros(size), where=number > 1)
    skewed = abs(_skewness(x, w)) > SKEWED
    kind = "median (quartiles)" if skewed else "mean (standard deviation)"
    digits = _digits(math.sqrt(float(squares.sum()) / max(1.0, float(number.sum()))))
    summaries: list[str | None] = [None] * size
    for k in filled:
        if skewed:
            three = quartiles(x[g == k], w[g == k])
            shown = 0 if (three == np.rint(three)).all() else digits
            low, middle, high = (decimal(float(q), shown) for q in three)
            summaries[k] = f"{middle} ({low} to {high})"
        else:
            spread = f" ({decimal(math.sqrt(variance[k]), digits)})" if number[k] > 1 else ""
            summaries[k] = f"{decimal(float(mean[k]), digits)}{spread}"
    pairs = [
        standardised_difference_of_means(float(mean[k]), float(variance[k]), float(mean[h]), float(variance[h]))
        for k, h in combinations([k for k in filled if number[k] > 1], 2)
    ]
    unit = f", {column.units}" if column.units else ""
    return _Line(f"{column.label}{unit}: {kind}", whole(number), summaries, _largest(pairs))


def _not_recorded(
    column: Column, recorded: NDArray[np.bool_], group: NDArray[np.int64], weight: Array, size: int
) -> list[list[_Line]]:
    """The line of records without a value, as a block of its own; none where every record has one."""
    belongs = group >= 0
    missing = belongs & ~recorded
    if not missing.any():
        return []
    number = np.bincount(group[missing], weights=weight[missing], minlength=size)
    totals = np.bincount(group[belongs], weights=weight[belongs], minlength=size)
    shares = [percent(float(number[k] / totals[k])) if totals[k] > 0 else None for k in range(size)]
    return [[_Line(f"{column.label}: not recorded", whole(number), shares)]]


def _laid_out(groups: Groups, blocks: list[list[_Line]], without_spread: list[str]) -> Table:
    columns = [TableColumn("label", "Characteristic")]
    for k, label in enumerate(groups.labels):
        key = f"group_{k + 1}_records"
        columns.append(TableColumn(key, f"{label}, records", "count", sums_known=True))
        columns.append(TableColumn(f"group_{k + 1}", f"{label}, summary", hidden_with=(key,)))
    columns.append(TableColumn("difference", "Standardised difference", "number", hidden_with_block=True))
    rows: list[tuple[Cell, ...]] = []
    numbers: list[int] = []
    for block, lines in enumerate(blocks):
        for line in lines:
            cells: list[Cell] = [line.label]
            for records, summary in zip(line.records, line.summaries, strict=True):
                cells += [int(records), summary]
            rows.append((*cells, line.difference))
            numbers.append(block)
    note = [groups.described, say("characteristics-note")]
    if len(groups.labels) > 2:
        note.append(say("largest-standardised-difference"))
    if without_spread:
        note.append(say("no-standardised-difference", labels=without_spread))
    return Table("characteristics", "Who they were", tuple(columns), tuple(rows), " ".join(note), tuple(numbers))


def _largest(differences: list[float | None]) -> float | None:
    """The largest, or None where there is none or one of them has no finite value."""
    found = [difference for difference in differences if difference is not None]
    return max(found) if found and len(found) == len(differences) else None


def _skewness(x: Array, weight: Array) -> float:
    total = float(weight.sum())
    # Nobody, or no spread: not skewed.
    if total == 0.0:
        return 0.0
    deviation = x - float(weight @ x) / total
    weighted = weight * deviation * deviation
    second = float(weighted.sum()) / total
    if second <= 0.0:
        return 0.0
    return float(weighted @ deviation) / total / math.sqrt(second) ** 3


def quartiles(x: Array, weight: Array) -> Array:
    """The quartiles (3,) of numbers that stand for `weight` equal ones each (Hyndman & Fan 1996, definition 7)."""
    order = np.argsort(x, kind="stable")
    cumulated = np.cumsum(weight[order])
    place = np.array([0.25, 0.5, 0.75]) * (cumulated[-1] - 1.0)
    below = np.floor(place)
    low = x[order][np.minimum(np.searchsorted(cumulated, below, side="right"), x.size - 1)]
    high = x[order][np.minimum(np.searchsorted(cumulated, below + 1.0, side="right"), x.size - 1)]
    return np.asarray(low + (place - below) * (high - low))


def _digits(spread: float) -> int:
    """Decimals that show about three significant digits of the standard deviation."""
    # No spread: whole numbers need none.
    if spread <= 0.0:
        return 1
    return min(6, max(0, 2 - math.floor(math.log10(spread))))
