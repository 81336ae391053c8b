"""Years between two dates, as decimal years of 365.25 days."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from oddsmodel.errors import Fault, InputFault
from oddsmodel.records.dates import parse_dates
from oddsmodel.records.derived.making import Array, Made, Making, Source, not_recorded, of_numbers, value_range
from oddsmodel.records.faults import fault
from oddsmodel.results.derived import DerivedCount
from oddsmodel.wording import finding, say
from oddsmodel.wording.plain import quoted

DAYS_IN_A_YEAR = 365.25
"""The mean length of a year of the Julian calendar: over four years with one leap day the years come out whole."""


def years(making: Making) -> Made:
    """A number column: days from the first date to the second, divided by 365.25.

    These are decimal years, not completed years of life: a person is 40.0 within a day of the fortieth birthday.
    Negative where the second date is before the first, which is told.

    Raises: InputFault where a source is not of kind date, and as `parse_dates` does.
    """
    days: list[Array] = []
    faults: list[Fault] = []
    for source in making.sources:
        try:
            days.append(_days(making, source))
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)
    start, end = days
    coded = of_numbers(making, (end - start) / DAYS_IN_A_YEAR)
    numbers = coded.values.to_numpy(dtype=np.float64)
    backwards = making.number(numbers < 0)
    if backwards:
        names = [source.column.name for source in making.sources]
        told = finding(
            "caution", "years-negative", column=making.name, first=names[0], second=names[1], records=backwards
        )
        coded = replace(coded, findings=(*coded.findings, told))
    return Made(coded, _counts(making, numbers, start, end))


def _days(making: Making, source: Source) -> Array:
    column = source.column
    if column.kind != "date":
        told: Fault = fault("derived-needs-date", making.where, source=quoted(column.name), kind=column.kind)
        raise InputFault(told)
    return parse_dates(source.coded.values, where=source.where, first_row=source.first_row)


def _counts(making: Making, numbers: Array, start: Array, end: Array) -> tuple[DerivedCount, ...]:
    """Records with and without years, and with each of the dates, with the range of calendar years."""
    recorded, known = say("derived-recorded"), ~np.isnan(numbers)
    rows = [
        DerivedCount(recorded, "", "", making.number(known), *value_range(numbers)),
        *not_recorded(making, "", ~known),
    ]
    for source, days in zip(making.sources, (start, end), strict=True):
        label, dated = source.column.label, ~np.isnan(days)
        rows.append(DerivedCount("", label, recorded, making.number(dated), *value_range(_calendar_year(days))))
        if not dated.all():
            rows.append(DerivedCount("", label, say("derived-not-recorded"), making.number(~dated)))
    return tuple(rows)


def _calendar_year(days: Array) -> Array:
    known = days[~np.isnan(days)].astype(np.int64)
    return known.astype("datetime64[D]").astype("datetime64[Y]").astype(np.int64).astype(np.float64) + 1970.0
