"""A column of a database's answer, gathered batch by batch as compact arrays of one type."""

from __future__ import annotations

import ipaddress
import uuid
from collections.abc import Sequence
from decimal import Decimal
from typing import Any

import numpy as np
import pyarrow as pa

from oddsmodel.records.arrow import WHOLE_BOUND, raw_column
from oddsmodel.records.python_values import values_column
from oddsmodel.records.raw import RawColumn

AS_TEXT = (uuid.UUID, ipaddress.IPv4Address, ipaddress.IPv6Address, ipaddress.IPv4Interface, ipaddress.IPv6Interface)


class BatchedColumn:
    """Values of one column in the order read. A batch is an Arrow array where its values are of one plain type."""

    def __init__(self) -> None:
        self._batches: list[pa.Array | Sequence[Any]] = []

    def add(self, values: Sequence[Any]) -> None:
        """Take the next batch of values; None is a value that is not there."""
        first = next((value for value in values if value is not None), None)
        if isinstance(first, AS_TEXT):
            values = [None if value is None else str(value) for value in values]
        elif isinstance(first, Decimal):
            values = _numbers(values)
        try:
            self._batches.append(pa.array(values))
        except (pa.ArrowException, OverflowError, ValueError, TypeError):
            self._batches.append(values)

    def raw(self) -> RawColumn | str:
        """The whole column as numbers or texts, or the word for what it holds where it is neither."""
        arrays = [batch for batch in self._batches if isinstance(batch, pa.Array)]
        if len(arrays) == len(self._batches):
            kind = _common([array.type for array in arrays])
            if kind is not None and (whole := _cast(arrays, kind)) is not None:
                return raw_column(whole)
        values: list[Any] = []
        for batch in self._batches:
            values += batch.to_pylist() if isinstance(batch, pa.Array) else batch
        mixed = np.empty(len(values), dtype=object)
        mixed[:] = values
        return values_column(mixed)


def _numbers(values: Sequence[Any]) -> list[Any]:
    """Exact decimals as floating-point numbers; all of them as texts where whole ones are too large for that."""
    decimals = [value for value in values if isinstance(value, Decimal) and value.is_finite()]
    if any(abs(value) > WHOLE_BOUND and value == value.to_integral_value() for value in decimals):
        return [None if value is None else format(value.normalize(), "f") for value in values]
    return [None if value is None else float(value) for value in values]


def _cast(arrays: Sequence[pa.Array], kind: pa.DataType) -> pa.ChunkedArray | None:
    """The batches as one column; None where a whole number is too large for floating point."""
    try:
        return pa.chunked_array([array.cast(kind) for array in arrays], type=kind)
    except pa.ArrowInvalid:
        return None


def _common(kinds: Sequence[pa.DataType]) -> pa.DataType | None:
    """The type of batches that differ only where a batch is empty or numbers are whole in one and not in another."""
    different = list(dict.fromkeys(kind for kind in kinds if not pa.types.is_null(kind)))
    if len(different) <= 1:
        return different[0] if different else pa.null()
    numbers = all(pa.types.is_integer(kind) or pa.types.is_floating(kind) for kind in different)
    return pa.float64() if numbers else None
