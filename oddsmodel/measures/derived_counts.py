"""A derived column counted beside what it was made from, so that a reader can see that it came about as meant."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.records.dates import parse_dates
from oddsmodel.records.levels import code_levels
from oddsmodel.records.same_value import same_value_key, yes_or_no
from oddsmodel.records.types import Column
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say

Array = NDArray[np.float64]
Codes = NDArray[np.intp]
Rows = list[tuple[Cell, ...]]

PARTS_BESIDE = 6
"""Parts of a score that stand side by side in one table."""
MOST_VALUES = 40
"""A score of more different values is not told apart by value."""


def derived_counts(
    derived: DerivedColumn, frame: pd.DataFrame, columns: Mapping[str, Column], counts: Array | None
) -> tuple[Table, ...]:
    """The tables of one derived column.

    frame: coded records (n rows) that hold it and its sources. counts (n,): records that each row stands for, None for
    one each. Bands: records with the smallest and largest value of the source in each; groups: records by level of
    the source; points: records by score and, of these, those in which each part is yes; years: their range and that of
    the calendar years of both dates.
    """
    weights = np.ones(len(frame)) if counts is None else counts
    work = _Counting(derived, frame, columns, weights)
    if derived.rule in ("bands_of", "quantile_groups_of"):
        return (work.bands(),)
    if derived.rule == "groups_of":
        return (work.groups(),)
    return work.points() if derived.rule == "points" else (work.years(),)


class _Counting:
    def __init__(
        self, derived: DerivedColumn, frame: pd.DataFrame, columns: Mapping[str, Column], weights: Array
    ) -> None:
        self.derived, self.frame, self.columns, self.weights = derived, frame, columns, weights
        self.labels = [columns[source].label for source in derived.sources]

    def bands(self) -> Table:
        levels, codes = self._levels()
        numbers = self.frame[self.derived.sources[0]].to_numpy(dtype=np.float64)
        rows: Rows = []
        for position, level in [*enumerate(levels), (-1, say("derived-not-recorded"))]:
            here = codes == position
            number = self._number(here)
            if position >= 0 or number:
                rows.append((self._row(level), number, *_ends(numbers[here])))
        return self._table("", (_LABEL, _RECORDS, *_range("smallest", "largest", self.labels[0])), rows)

    def groups(self) -> Table:
        levels, codes = self._levels()
        source = code_levels(self.frame[self.derived.sources[0]], (), levels=None, kind="category")
        found, blocks = Rows(), []
        for position, level in [*enumerate(levels), (-1, say("derived-in-no-group"))]:
            here = codes == position
            known = here & (source.codes >= 0)
            tally = np.bincount(source.codes[known], self.weights[known], minlength=len(source.levels))
            counted = [(source.levels[at], round(tally[at])) for at in np.flatnonzero(tally > 0)]
            # Levels that the plan does not name are texts of the file: they are not written out.
            if position < 0:
                counted = [(say("derived-other-levels"), number)] if (number := self._number(known)) else []
            rows: Rows = [(self._row(level), of_source, number) for of_source, number in counted]
            missing = self._number(here & ~known)
            if missing:
                rows.append((self._row(level), say("derived-not-recorded"), missing))
            found += rows
            blocks += [position] * len(rows)
        head = TableColumn("source", say("derived-level-of", label=self.labels[0]))
        return self._table("", (_LABEL, head, _RECORDS), found, tuple(blocks))

    def points(self) -> tuple[Table, ...]:
        score = self.frame[self.derived.name].to_numpy(dtype=np.float64)
        codes, found = pd.factorize(score, sort=True)
        names = [same_value_key(float(value)) for value in found]
        if len(names) > MOST_VALUES:
            codes, names = np.where(np.isnan(score), -1, 0), [say("derived-recorded")]
        parts = [self._yes(source) for source in self.derived.sources]
        chunks = range(0, len(parts), PARTS_BESIDE)
        return tuple(
            self._points(
                number if len(chunks) > 1 else 0,
                names,
                codes,
                range(start, min(start + PARTS_BESIDE, len(parts))),
                parts,
            )
            for number, start in enumerate(chunks, start=1)
        )

    def _points(
        self, number: int, names: Sequence[str], codes: Codes, chosen: range, parts: Sequence[NDArray[np.bool_]]
    ) -> Table:
        heads = [
            TableColumn(
                f"{self.derived.sources[k]}_yes", say("derived-part", label=self.labels[k]), "count", "records", True
            )
            for k in chosen
        ]
        rows: Rows = []
        for position, name in [*enumerate(names), (-1, say("derived-not-recorded"))]:
            here = codes == position
            records = self._number(here)
            if records:
                rows.append((self._row(name), records, *(self._number(here & parts[k]) for k in chosen)))
        return self._table(f"-{number}" if number else "", (_LABEL, _RECORDS, *heads), rows)

    def _yes(self, source: str) -> NDArray[np.bool_]:
        coded = code_levels(self.frame[source], (), levels=None, kind="category")
        yes = np.asarray([yes_or_no(level) == "yes" for level in coded.levels] + [False], dtype=np.bool_)
        return yes[coded.codes]

    def years(self) -> Table:
        numbers = self.frame[self.derived.name].to_numpy(dtype=np.float64)
        rows, blocks = self._with_and_without(self.derived.label, numbers, 0)
        for block, (source, label) in enumerate(zip(self.derived.sources, self.labels, strict=True), start=1):
            days = parse_dates(self.frame[source], where=label)
            found, own = self._with_and_without(label, _calendar_years(days), block)
            rows += [(*row[:2], None, None, *row[2:4]) for row in found]
            blocks += own
        heads = (
            *_range("smallest", "largest", say("derived-years")),
            *_range("earliest", "latest", say("derived-dates")),
        )
        rows = [row if len(row) == 6 else (*row, None, None) for row in rows]
        return self._table("", (_LABEL, _RECORDS, *heads), rows, tuple(blocks))

    def _with_and_without(self, label: str, numbers: Array, block: int) -> tuple[Rows, list[int]]:
        known = ~np.isnan(numbers)
        rows: Rows = [(f"{label}: {say('derived-recorded')}", self._number(known), *_ends(numbers))]
        if not known.all():
            rows.append((f"{label}: {say('derived-not-recorded')}", self._number(~known), None, None))
        return rows, [block] * len(rows)

    def _levels(self) -> tuple[tuple[str, ...], Codes]:
        values = self.frame[self.derived.name]
        return tuple(map(str, values.cat.categories)), np.asarray(values.cat.codes, dtype=np.intp)

    def _row(self, level: str) -> str:
        return f"{self.derived.label}: {level}"

    def _number(self, rows: NDArray[np.bool_]) -> int:
        return round(float(self.weights[rows].sum()))

    def _table(self, ending: str, heads: Sequence[TableColumn], rows: Rows, blocks: tuple[int, ...] = ()) -> Table:
        title = say("derived-title", label=self.derived.label)
        note = say("derived-note", told=self.derived.told, ends=any(head.rounded for head in heads))
        return Table(f"derived-{self.derived.name}{ending}", title, tuple(heads), tuple(rows), note, blocks)


_LABEL = TableColumn("label", say("derived-heading-label"))
_RECORDS = TableColumn("records", say("derived-heading-records"), "count", sums_known=True)


def _range(lower: str, upper: str, label: str) -> tuple[TableColumn, TableColumn]:
    return (
        TableColumn(
            lower,
            say(f"derived-{lower}", label=label),
            "number",
            hidden_with=("records",),
            rounded="down",
            other_end=upper,
        ),
        TableColumn(
            upper,
            say(f"derived-{upper}", label=label),
            "number",
            hidden_with=("records",),
            rounded="up",
            other_end=lower,
        ),
    )


def _ends(numbers: Array) -> tuple[float | None, float | None]:
    found = numbers[~np.isnan(numbers)]
    return (float(found.min()), float(found.max())) if len(found) else (None, None)


def _calendar_years(days: Array) -> Array:
    """The calendar years (n,) of days since 1970-01-01, NaN where there is none."""
    years = np.full(len(days), np.nan)
    known = ~np.isnan(days)
    months = days[known].astype(np.int64).astype("datetime64[D]").astype("datetime64[Y]")
    years[known] = months.astype(np.int64) + 1970.0
    return years
