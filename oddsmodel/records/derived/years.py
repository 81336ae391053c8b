"""Years between two dates, as decimal years of 365.25 days."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from oddsmodel.errors import Fault, InputFault
from oddsmodel.records.dates import parse_dates
from oddsmodel.records.derived.making import Array, Made, Making, Source, of_numbers
from oddsmodel.records.faults import fault
from oddsmodel.wording import finding
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
    return Made(coded)


def _days(making: Making, source: Source) -> Array:
    column = source.column
    if column.kind != "date":
        told: Fault = fault("derived-needs-date", making.where, source=quoted(column.name), kind=column.kind)
        raise InputFault(told)
    return parse_dates(source.coded.values, where=source.where, first_row=source.first_row)
