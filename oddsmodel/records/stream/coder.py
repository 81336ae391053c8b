"""A block of a source coded as its columns were settled, one column at a time and whatever the block holds."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import pandas as pd
import pyarrow as pa
from numpy.typing import NDArray

from oddsmodel.records.arrow import as_numbers, as_texts, different_values, plain_values, what_it_holds
from oddsmodel.records.coding import WITH_LEVELS, CodedColumn
from oddsmodel.records.levels import OUTSIDE, code_levels
from oddsmodel.records.numbers import code_number
from oddsmodel.records.plausible import within_plausible
from oddsmodel.records.rows import RowsInOrder
from oddsmodel.records.same_value import absent_mask
from oddsmodel.records.texts import text_column, without_texts
from oddsmodel.records.types import Column

Codes = NDArray[np.intp]


@dataclass(frozen=True)
class ColumnCode:
    """How the values of one column are coded.

    in_file: its name there. not_recorded: keys of the texts that mean it. as_texts: whole numbers are kept as texts;
    days_only: see `Miniature`. everyone: for a column of groups the texts of all of them, in order. day_first: see
    `CodedColumn`.
    """

    column: Column
    in_file: str
    not_recorded: frozenset[str]
    as_texts: bool = False
    days_only: bool = False
    plausible: tuple[float, ...] | None = None
    everyone: tuple[str, ...] | None = None
    day_first: Mapping[str, bool] | None = None

    def coded(self, values: pa.ChunkedArray) -> CodedColumn:
        """The column of a block, as `code_column` would code it among all rows."""
        values = plain_values(values)
        holds = what_it_holds(values.type)
        if holds == "nothing":
            return self._of_raw(pd.Series(np.full(len(values), np.nan)), None)
        if holds in ("numbers", "whole numbers") and not self.as_texts:
            return self._of_raw(pd.Series(as_numbers(values)), None)
        dictionary, codes = different_values(values)
        texts = as_texts(dictionary, days_only=self.days_only)
        raw = text_column(texts, np.arange(len(texts)), "text")
        return self._of_raw(raw.values, codes)

    def _of_raw(self, different: pd.Series, codes: Codes | None) -> CodedColumn:
        """The cells of a block. codes (n,): which of the different values each cell has, -1 none; None: one each."""
        if self.column.kind == "number":
            return self._numbers(different, codes)
        if self.column.kind in WITH_LEVELS:
            found = code_levels(different, self.not_recorded, levels=self.column.levels, kind=self.column.kind).codes
            found = _taken(found, codes, -1)
            outside = found == OUTSIDE
            values = pd.Series(pd.Categorical.from_codes(np.where(outside, -1, found), dtype=self._levels))
            return CodedColumn(values, self.column, outside if outside.any() else None)
        return CodedColumn(self._texts(different, codes), self.column, day_first=self.day_first)

    def _numbers(self, different: pd.Series, codes: Codes | None) -> CodedColumn:
        numbers, _ = code_number(different, self.not_recorded, where="", rows=RowsInOrder())
        numbers, implausible = within_plausible(numbers, self.plausible)
        numbers = _taken(numbers, codes, np.nan)
        if implausible is not None:
            implausible = _taken(implausible, codes, False)
        return CodedColumn(pd.Series(numbers), self.column, implausible=implausible)

    def _texts(self, different: pd.Series, codes: Codes | None) -> pd.Series:
        if isinstance(different.dtype, pd.CategoricalDtype):
            texts = list(different.cat.categories)
            recorded = without_texts(different, absent_mask(texts, self.not_recorded))
        else:
            recorded = code_levels(different, self.not_recorded, levels=None, kind=self.column.kind).series()
        found = _taken(np.asarray(recorded.cat.codes, dtype=np.intp), codes, -1)
        if self._everyone is None:
            return pd.Series(pd.Categorical.from_codes(found, categories=recorded.cat.categories))
        of_all = np.append(self._everyone.categories.get_indexer(recorded.cat.categories), -1)
        return pd.Series(pd.Categorical.from_codes(of_all[found], dtype=self._everyone))

    @cached_property
    def _levels(self) -> pd.CategoricalDtype:
        return pd.CategoricalDtype(pd.Index(list(self.column.levels), dtype=object), self.column.kind == "ordered")

    @cached_property
    def _everyone(self) -> pd.CategoricalDtype | None:
        return None if self.everyone is None else pd.CategoricalDtype(pd.Index(list(self.everyone), dtype=object))

    def __getstate__(self) -> dict[str, Any]:
        return {name: value for name, value in self.__dict__.items() if not name.startswith("_")}


def _taken(values: NDArray[Any], codes: Codes | None, none: Any) -> NDArray[Any]:
    """The value of each cell; `none` for an empty one."""
    return values if codes is None else np.append(values, none)[codes]
