"""Columns of Python values (a data frame's, a spreadsheet's) to raw columns."""

from __future__ import annotations

import datetime
from collections.abc import Hashable
from decimal import Decimal
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
from numpy.typing import NDArray

from oddsmodel.records.arrow import WHOLE_BOUND, raw_column
from oddsmodel.records.raw import RawColumn, RawType
from oddsmodel.records.same_value import same_value_key
from oddsmodel.records.texts import text_column

DATES = (datetime.date, datetime.datetime, datetime.time, np.datetime64, pd.Period)
WHOLE = (int, np.integer)
REAL = (float, np.floating, Decimal)


def spelling(value: object) -> str:
    """A value as the text that a file would hold for it: 1.0 is "1", a date is in ISO order."""
    if isinstance(value, bool | np.bool_):
        return "true" if value else "false"
    if isinstance(value, WHOLE + REAL):
        return same_value_key(value)
    if isinstance(value, datetime.datetime) and value.time() == datetime.time() and value.tzinfo is None:
        return value.date().isoformat()
    if isinstance(value, datetime.date | datetime.time):
        return value.isoformat()
    return str(value).encode("utf-8", errors="replace").decode("utf-8")


def series_column(series: pd.Series) -> RawColumn | str:
    """A data frame's column as numbers or texts, or the word for what it holds where it is neither."""
    dtype = series.dtype
    if isinstance(dtype, pd.CategoricalDtype):
        return _categorical(series, dtype.ordered)
    if isinstance(dtype, pd.SparseDtype):
        return series_column(pd.Series(np.asarray(series)))
    if isinstance(dtype, pd.PeriodDtype | pd.IntervalDtype) or dtype == np.dtype("O"):
        return values_column(series.to_numpy(dtype=object))
    if dtype.kind == "c":
        return "complex numbers"
    if dtype == np.longdouble and dtype != np.float64:
        return RawColumn(pd.Series(series.to_numpy(dtype=np.float64)), "number")
    column = pa.Array.from_pandas(series)
    return raw_column(column if isinstance(column, pa.ChunkedArray) else pa.chunked_array([column]))


def values_column(values: NDArray[Any]) -> RawColumn | str:
    """A column of Python values (n,), of one type or of several mixed."""
    try:
        codes, found = pd.factorize(values, use_na_sentinel=True)
    except TypeError:
        return "lists or other compound values"
    different = list(found)
    if not all(_is_plain(value) for value in different):
        return "compound values"
    if not different:
        return RawColumn(pd.Series(np.full(len(values), np.nan)), "empty")
    kind = _type_of(different)
    if kind == "number":
        numbers = np.append(np.asarray([float(value) for value in different], dtype=np.float64), np.nan)
        return RawColumn(pd.Series(numbers[codes]), "number")
    spelt = pa.array([spelling(value) for value in different], pa.string())
    return text_column(spelt, codes, kind)


def _categorical(series: pd.Series, ordered: bool | None) -> RawColumn | str:
    categories = list(series.cat.categories)
    if not all(_is_plain(value) for value in categories):
        return "compound values"
    spelt = pa.array([spelling(value) for value in categories], pa.string())
    codes = np.asarray(series.cat.codes, dtype=np.intp)
    return text_column(spelt, codes, "ordered" if ordered else "category")


def _is_plain(value: Hashable) -> bool:
    return isinstance(value, (*WHOLE, *REAL, *DATES, str, bool, np.bool_, pd.Interval))


def _type_of(values: list[Any]) -> RawType:
    if all(isinstance(value, bool | np.bool_) for value in values):
        return "yes-no"
    if all(isinstance(value, DATES) for value in values):
        return "date"
    numbers = all(isinstance(value, WHOLE + REAL) and not isinstance(value, bool) for value in values)
    if numbers and not any(isinstance(value, WHOLE) and abs(int(value)) > WHOLE_BOUND for value in values):
        return "number"
    return "text"
