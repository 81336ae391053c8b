"""Dates to days: expected days from Python's own calendar (`datetime.date.toordinal`)."""

from __future__ import annotations

import datetime

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.errors import InputFault
from oddsmodel.records.dates import parse_dates

WHERE = 'visits.csv, column "admitted"'


def days(*texts: str | None) -> list[float]:
    return list(parse_dates(pd.Series(texts, dtype=object).astype("category"), where=WHERE))


def expected(year: int, month: int, day: int) -> float:
    return float((datetime.date(year, month, day) - datetime.date(1970, 1, 1)).days)


def fault_of(*texts: str | None) -> str:
    with pytest.raises(InputFault) as caught:
        days(*texts)
    return str(caught.value)


def test_year_first_with_any_sign_and_a_time_of_day_left_aside():
    found = days("2024-02-29", "2024/2/9", "2024.02.09", "2024-03-01T23:59:00Z", "2024-03-01 08:15:30.5", None)
    assert found[:5] == [expected(2024, 2, 29), *[expected(2024, 2, 9)] * 2, *[expected(2024, 3, 1)] * 2]
    assert np.isnan(found[5])


def test_a_number_above_twelve_settles_the_order_for_the_whole_column():
    assert days("03/04/2024", "13/02/2024") == [expected(2024, 4, 3), expected(2024, 2, 13)]
    assert days("03/04/2024", "02/13/2024") == [expected(2024, 3, 4), expected(2024, 2, 13)]
    assert days("2023-12-31", "3.4.2024", "28.2.2024") == [
        expected(2023, 12, 31),
        expected(2024, 4, 3),
        expected(2024, 2, 28),
    ]


def test_equal_day_and_month_read_the_same_either_way():
    assert days("05/05/2024", "2024-01-02") == [expected(2024, 5, 5), expected(2024, 1, 2)]


def test_an_order_that_nothing_settles_is_a_fault():
    told = fault_of("2024-12-31", "03/04/2024", "05/05/2024", "01/02/2024")
    assert WHERE in told
    assert "row 3 has “03/04/2024” and row 5 has “01/02/2024”" in told
    assert "2024-03-14" in told


def test_dates_written_with_another_sign_do_not_settle_the_order():
    assert "whether day or month comes first" in fault_of("03/04/2024", "13.02.2024")


def test_an_order_that_differs_within_the_column_is_a_fault():
    told = fault_of("13/02/2024", "02/14/2024", "03/04/2024")
    assert "“13/02/2024”" in told
    assert "“02/14/2024”" in told


def test_texts_that_are_no_date_are_told_together_with_two_digit_years():
    told = fault_of("2024-01-01", "unknown", "13/02/24", "2024-01/02", "20240102")
    assert "row 3 has “unknown”" in told
    assert "row 4 has “13/02/24”" in told
    assert "two digits" in told
    assert "“2024-01/02”" in told
    assert "“20240102”" in told


def test_days_that_the_calendar_does_not_have():
    told = fault_of("2023-02-29", "2024-02-29", "2024-13-01", "2024-00-10", "2024-04-31", "9999-12-31", "31/04/2024")
    for text in ("2023-02-29", "2024-13-01", "2024-00-10", "2024-04-31", "31/04/2024"):
        assert text in told
    assert "2024-02-29" not in told
    assert "after 2200" in told


def test_categories_that_no_row_holds_are_passed_over():
    values = pd.Series(pd.Categorical(["2024-01-02"], categories=["unknown", "2024-01-02"]))
    assert list(parse_dates(values, where=WHERE)) == [expected(2024, 1, 2)]


def test_a_column_without_any_date():
    assert np.isnan(parse_dates(pd.Series(pd.Categorical([None, None])), where=WHERE)).all()


def test_very_many_faulty_rows_are_counted_not_listed():
    assert "95 more rows" in fault_of(*["soon"] * 100)


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.lists(st.dates(datetime.date(1800, 1, 1), datetime.date(2200, 12, 31)), min_size=1, max_size=20))
def test_any_date_of_the_calendar_in_each_spelling(dates: list[datetime.date]):
    wanted = [expected(d.year, d.month, d.day) for d in dates]
    assert days(*[d.isoformat() for d in dates]) == wanted
    settling = datetime.date(2024, 1, 31)
    assert days(*[d.strftime("%d/%m/") + f"{d.year:04d}" for d in [*dates, settling]])[:-1] == wanted
    assert days(*[d.strftime("%m/%d/") + f"{d.year:04d}" for d in [*dates, settling]])[:-1] == wanted
