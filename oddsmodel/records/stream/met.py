"""The different values of a coded column, with the rows and the records that have each, told block by block."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.records.coding import CodedColumn
from oddsmodel.records.types import Column

Array = NDArray[np.float64]
BYTES_OF_A_VALUE = 200


class Met:
    """column: what is known of it. values: by value the rows and the records that have it; None: not recorded.
    outside: rows and records with a level that is not in the plan."""

    def __init__(self, column: Column) -> None:
        self.column = column
        self.values: dict[str | float | None, tuple[int, float]] = {}
        self.outside = (0, 0.0)

    @property
    def size(self) -> int:
        return BYTES_OF_A_VALUE * len(self.values)

    def add(self, coded: CodedColumn, records: Array) -> None:
        """A block; records (n,): what each row stands for."""
        codes, found = _codes(coded.values)
        place = codes + 2 if coded.outside is None else np.where(coded.outside, 0, codes + 2)
        outside_rows, *rows_of = np.bincount(place, minlength=len(found) + 2)
        outside_records, *records_of = np.bincount(place, records, minlength=len(found) + 2)
        self.outside = self.outside[0] + int(outside_rows), self.outside[1] + float(outside_records)
        values = [None, *found]
        for at in np.flatnonzero(rows_of):
            rows, number = self.values.get(values[at], (0, 0.0))
            self.values[values[at]] = rows + int(rows_of[at]), number + float(records_of[at])

    def in_small(self, texts: Sequence[str] = ()) -> tuple[CodedColumn, Array]:
        """The column with every value once and the records of each, levels and numbers in their order.

        texts: the order of those of a column without levels.
        """
        met = [value for value in self.values if value is not None]
        order = {level: at for at, level in enumerate(self.column.levels or texts)}
        if order or self.column.kind == "number":
            met.sort(key=lambda value: order[str(value)] if order else float(value))
        records = [self.values[value][1] for value in met]
        codes = [order[str(value)] if order else at for at, value in enumerate(met)]
        outside = np.zeros(len(met), dtype=np.bool_)
        for there, number, is_outside in (
            (None in self.values, self.values.get(None, (0, 0.0))[1], False),
            (self.outside[0] > 0, self.outside[1], True),
        ):
            if there:
                records.append(number)
                codes.append(-1)
                outside = np.append(outside, is_outside)
        if self.column.kind == "number":
            values = pd.Series(np.asarray([*met, *[np.nan] * (len(codes) - len(met))], dtype=np.float64))
        else:
            categories = pd.Index(list(order or met), dtype=object)
            ordered = self.column.kind == "ordered"
            values = pd.Series(pd.Categorical.from_codes(np.asarray(codes, np.intp), categories, ordered))
        coded = CodedColumn(values, self.column, outside if outside.any() else None)
        return coded, np.asarray(records, dtype=np.float64)


def _codes(values: pd.Series) -> tuple[NDArray[np.intp], list[str] | list[float]]:
    if isinstance(values.dtype, pd.CategoricalDtype):
        return np.asarray(values.cat.codes, dtype=np.intp), list(values.cat.categories)
    codes, found = pd.factorize(values.to_numpy(dtype=np.float64))
    return np.asarray(codes, dtype=np.intp), [float(number) for number in found]
