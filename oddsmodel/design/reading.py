"""Columns of a frame as plain arrays, each read once, checked to hold no value that is not recorded."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.coded import CodedRows
from oddsmodel.design.faults import piece
from oddsmodel.errors import InputFault
from oddsmodel.plan.faults import fault

Array = NDArray[np.float64]


class Reader:
    """Reads the columns of n records; `where` is the place of the formula that asks."""

    def __init__(self, frame: pd.DataFrame | CodedRows, where: str) -> None:
        self.frame, self.where = frame, where
        self.records = len(frame)
        self.first = frame.first if isinstance(frame, CodedRows) else 0
        self._numbers: dict[str, Array] = {}

    def number(self, column: str) -> Array:
        """A number column (n,). InputFault where it is missing, not of numbers or not recorded in some record."""
        if column not in self._numbers:
            if isinstance(self.frame, CodedRows):
                values = self._array(self.frame, column)
                self._none_missing(column, ~np.isfinite(values))
                return self._numbers.setdefault(column, values)
            series = self._series(self.frame, column)
            if not pd.api.types.is_numeric_dtype(series.dtype) or pd.api.types.is_complex_dtype(series.dtype):
                raise self.fault("design-column-not-numbers", column)
            values = series.to_numpy(dtype=np.float64)
            self._none_missing(column, ~np.isfinite(values))
            self._numbers[column] = values
        return self._numbers[column]

    def level_codes(self, column: str, levels: tuple[str, ...]) -> NDArray[np.integer]:
        """The place of each record's level (n,) among `levels`.

        InputFault where the column is missing, is not recorded in some record, or has a level that is none of them.
        """
        codes, names = self._coded(column)
        if codes.size and codes.min() < 0:
            self._none_missing(column, codes < 0)
        if tuple(names) == levels:
            return codes
        place = {level: number for number, level in enumerate(levels)}
        lookup = np.array([place.get(name, -1) for name in names] or [-1], dtype=np.int32)
        found: NDArray[np.integer] = np.asarray(lookup[codes])
        if found.size and found.min() < 0:
            self.unseen(column, found < 0, names[codes[int(np.argmax(found < 0))]])
        return found

    def unseen(self, column: str, which: NDArray[np.bool_], level: str) -> None:
        """Raise the fault of records whose level the model does not know."""
        raise self.fault(
            "design-level-unseen",
            column,
            level=piece(level),
            unseen_records=int(which.sum()),
            row=self.first + int(np.argmax(which)) + 1,
        )

    def _coded(self, column: str) -> tuple[NDArray[np.integer], list[str]]:
        """The place of each record's level (n,), below 0 where not recorded, and the levels."""
        if isinstance(self.frame, CodedRows):
            return self._array(self.frame, column), list(self.frame.levels[column])
        series = self._series(self.frame, column)
        categorical = series.array if isinstance(series.dtype, pd.CategoricalDtype) else pd.Categorical(series)
        return np.asarray(categorical.codes), [str(name) for name in categorical.categories]

    def _series(self, frame: pd.DataFrame, column: str) -> pd.Series:
        if column not in frame.columns:
            raise self.fault("design-column-missing", column)
        return frame[column]

    def _array(self, rows: CodedRows, column: str) -> NDArray[Any]:
        if column not in rows.arrays:
            raise self.fault("design-column-missing", column)
        return rows.arrays[column]

    def _none_missing(self, column: str, missing: NDArray[np.bool_]) -> None:
        if missing.any():
            raise self.fault(
                "design-not-recorded",
                column,
                missing_records=int(missing.sum()),
                row=self.first + int(np.argmax(missing)) + 1,
            )

    def fault(self, code: str, column: str, **facts: object) -> InputFault:
        return InputFault(fault(code, self.where, column=piece(column), **facts))
