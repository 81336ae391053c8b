"""Dates written as texts to days; where day and month could be either way round, that is a fault and not a guess."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from oddsmodel.errors import Fault, InputFault
from oddsmodel.records.faults import fault
from oddsmodel.records.rows import Rows, RowsInOrder
from oddsmodel.wording.plain import quoted

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
Whole = NDArray[np.int64]

TIME_OF_DAY = r"(?:[T ][0-9]{1,2}:[0-9]{2}(?::[0-9]{2}(?:[.,][0-9]+)?)?(?:Z| ?[+-][0-9]{2}:?[0-9]{2})?)?"
YEAR_FIRST = r"^(?P<first>[0-9]{4})(?P<sign>[-/.])(?P<second>[0-9]{1,2})(?P<again>[-/.])(?P<third>[0-9]{1,2})"
YEAR_LAST = r"^(?P<first>[0-9]{1,2})(?P<sign>[-/.])(?P<second>[0-9]{1,2})(?P<again>[-/.])(?P<third>[0-9]{4})"
TWO_DIGITS = r"^[0-9]{1,2}[-/.][0-9]{1,2}[-/.][0-9]{2}$"
FIRST_YEAR, LAST_YEAR = 1800, 2200


@dataclass(frozen=True, slots=True)
class _Cells:
    """The different texts (k,) of a column, the code (n,) of each value among them (-1: empty), and where it is."""

    texts: list[str]
    codes: NDArray[np.intp]
    where: str
    rows: Rows

    def fault(self, code: str, wanted: Mask, **facts: Any) -> Fault:
        """A fault that names the first rows whose text is among the wanted (k,)."""
        at = np.flatnonzero(np.append(wanted, False)[self.codes])
        named, positions = self.rows.first(at)
        values = [quoted(self.texts[self.codes[position]]) for position in positions]
        return fault(code, self.where, rows=named, values=values, total=self.rows.total(at), **facts)


def parse_dates(
    texts: pd.Series, *, where: str, rows: Rows | None = None, day_first: Mapping[str, bool] | None = None
) -> Array:
    """Days since 1970-01-01 (n,), NaN where the cell is empty. A time of day is left aside.

    texts: a categorical or object series of texts (n,), such as a column of kind date in `Records.frame`.
    where: the place of the column in messages (`records.faults.in_column`); rows: by default the first is called 2.
    day_first: the order of day and month by sign where it is settled (`orders_of_dates`), as for a part of a column.

    A date is year-month-day, in which a slash or a point may stand for the dash, or has its four-digit year last:
    13/02/2024 or 02/13/2024. For these the order of day and month is settled by a number above 12, met in any date of
    the column that is written with the same sign.

    Raises: InputFault with all of: texts that are no date, years of two digits, days that the calendar does not have,
        years before 1800 or after 2200, an order of day and month that no date settles, or that two settle
        differently.
    """
    cells = _cells(texts, where, rows or RowsInOrder())
    days, _, faults = _days(cells, day_first)
    if faults:
        raise InputFault(faults)
    return np.append(days, np.nan)[cells.codes]


def orders_of_dates(texts: pd.Series, *, where: str, rows: Rows) -> dict[str, bool]:
    """Whether the day comes first in dates with the year last, by their sign. Raises: InputFault as `parse_dates`."""
    _, day_first, faults = _days(_cells(texts, where, rows), None)
    if faults:
        raise InputFault(faults)
    return day_first


def _cells(texts: pd.Series, where: str, rows: Rows) -> _Cells:
    """The texts that are met."""
    if isinstance(texts.dtype, pd.CategoricalDtype):
        codes, known = np.asarray(texts.cat.codes, dtype=np.intp), [str(text) for text in texts.cat.categories]
    else:
        codes, found = pd.factorize(texts)
        known = [str(text) for text in found]
    met = np.bincount(codes + 1, minlength=len(known) + 1)[1:] > 0
    position = np.append(np.where(met, np.cumsum(met) - 1, -1), -1)
    return _Cells([text for text, here in zip(known, met, strict=True) if here], position[codes], where, rows)


def _days(cells: _Cells, settled: Mapping[str, bool] | None) -> tuple[Array, dict[str, bool], list[Fault]]:
    """The days (k,) of the different texts, whether the day comes first by sign, and what is wrong with them."""
    texts = pa.array(cells.texts, pa.string())
    iso, (year, month, day), _ = _parts(texts, YEAR_FIRST)
    last, (first, second, late), signs = _parts(texts, YEAR_LAST)
    faults: list[Fault] = []
    orders: dict[str, bool] = {}
    other = ~iso & ~last
    short = other & np.asarray(pc.match_substring_regex(texts, TWO_DIGITS).to_numpy(zero_copy_only=False), dtype=bool)
    for code, at in (("date-two-digit-year", short), ("date-not-readable", other & ~short)):
        if at.any():
            faults.append(cells.fault(code, at))
    for sign in sorted(set(signs[last])):
        here = last & (signs == sign)
        day_first, wrong = _order(cells, here, first, second) if settled is None else (settled[sign], None)
        if wrong is not None:
            faults.append(wrong)
            continue
        orders[sign] = day_first
        year[here] = late[here]
        day[here], month[here] = (first[here], second[here]) if day_first else (second[here], first[here])
    if faults:
        return np.empty(0), orders, faults
    days, faults = _in_calendar(cells, year, month, day)
    return days, orders, faults


def _parts(texts: pa.Array, pattern: str) -> tuple[Mask, tuple[Whole, Whole, Whole], NDArray[Any]]:
    """Which texts (k,) fit the pattern, their three numbers, and the sign between these."""
    found = pc.extract_regex(texts, pattern=f"{pattern}{TIME_OF_DAY}$")
    sign, again = pc.struct_field(found, "sign").fill_null(""), pc.struct_field(found, "again").fill_null("-")
    fits = np.asarray(pc.equal(sign, again).to_numpy(zero_copy_only=False), dtype=np.bool_)
    numbers = _number(found, "first"), _number(found, "second"), _number(found, "third")
    return fits, numbers, np.asarray(sign.to_numpy(zero_copy_only=False), dtype=object)


def _number(found: pa.StructArray, name: str) -> Whole:
    number = pc.struct_field(found, name).fill_null("0").cast(pa.int64())
    return np.array(number.to_numpy(zero_copy_only=False), dtype=np.int64)


def _order(cells: _Cells, here: Mask, first: Whole, second: Whole) -> tuple[bool, Fault | None]:
    """Whether the day comes first in the dates `here`, or the fault that nothing or too much says so."""
    day_first, month_first = here & (first > 12), here & (second > 12)
    if day_first.any() and month_first.any():
        examples = [quoted(cells.texts[int(np.flatnonzero(at)[0])]) for at in (day_first, month_first)]
        return True, cells.fault("date-orders-differ", month_first, examples=examples)
    open_ones = here & (first != second)
    if not day_first.any() and not month_first.any() and open_ones.any():
        return True, cells.fault("date-order-ambiguous", open_ones)
    return bool(not month_first.any()), None


def _in_calendar(cells: _Cells, year: Whole, month: Whole, day: Whole) -> tuple[Array, list[Fault]]:
    """The days (k,) since 1970-01-01 of dates that the calendar has, and the faults of those that it has not."""
    possible = (month >= 1) & (month <= 12) & (year >= 1)
    months = (year - 1970) * 12 + np.where(possible, month, 1) - 1
    start = months.astype("datetime64[M]").astype("datetime64[D]").astype(np.int64)
    end = (months + 1).astype("datetime64[M]").astype("datetime64[D]").astype(np.int64)
    possible &= (day >= 1) & (day <= end - start)
    far = possible & ((year < FIRST_YEAR) | (year > LAST_YEAR))
    faults = [cells.fault("date-not-in-calendar", ~possible)] if (~possible).any() else []
    if far.any():
        faults.append(cells.fault("date-far-off", far, least=FIRST_YEAR, most=LAST_YEAR))
    return (start + day - 1).astype(np.float64), faults
