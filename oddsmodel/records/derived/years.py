"""Years between two dates, as decimal years of 365.25 days."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
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
    start, end = days_of_sources(making)
    coded = of_numbers(making, (end - start) / DAYS_IN_A_YEAR)
    backwards = making.number(coded.values.to_numpy(dtype=np.float64) < 0)
    return Made(replace(coded, findings=(*coded.findings, *told_of_years(making, backwards))))


def told_of_years(making: Making, backwards: int) -> tuple[Finding, ...]:
    """What is said of records whose second date is before the first."""
    if not backwards:
        return ()
    first, second = (source.column.name for source in making.sources)
    return (finding("caution", "years-negative", column=making.name, first=first, second=second, records=backwards),)


def days_of_sources(making: Making) -> list[Array]:
    """The days (n,) of each source. Raises: InputFault as `years` does, for all sources together."""
    days: list[Array] = []
    faults: list[Fault] = []
    for source in making.sources:
        try:
            days.append(_days(making, source))
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(faults)
    return days


def _days(making: Making, source: Source) -> Array:
    column = source.column
    if column.kind != "date":
        told: Fault = fault("derived-needs-date", making.where, source=quoted(column.name), kind=column.kind)
        raise InputFault(told)
    return parse_dates(source.coded.values, where=source.where, rows=source.rows, day_first=source.coded.day_first)
