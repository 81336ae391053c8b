"""Arrow columns of every plain type to raw columns; nested ones are refused."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc

from oddsmodel.records.raw import RawColumn
from oddsmodel.records.texts import text_column

WHOLE_BOUND = 2**53
NO_FRACTION = r"(:[0-9]{2})\.0+(Z|$)"
MIDNIGHT = r"[ T]00:00(:00(\.0+)?)?$"


def raw_column(column: pa.ChunkedArray) -> RawColumn | str:
    """The column as numbers or texts, or, where it is neither, the word for what it holds.

    Whole numbers beyond 2^53 cannot be told apart as float64: they are kept as texts. Dates are texts.
    """
    kind = column.type
    if isinstance(kind, pa.BaseExtensionType):
        return raw_column(pa.chunked_array([chunk.storage for chunk in column.chunks], type=kind.storage_type))
    if pa.types.is_dictionary(kind):
        return _dictionary(column)
    if pa.types.is_null(kind):
        return RawColumn(pd.Series(np.full(len(column), np.nan)), "empty")
    if pa.types.is_boolean(kind):
        return _texts(column.cast(pa.string()), "yes-no")
    if pa.types.is_integer(kind) or (pa.types.is_decimal(kind) and kind.scale <= 0):
        bounds = pc.min_max(column).as_py()
        if bounds["max"] is not None and max(abs(bounds["min"]), abs(bounds["max"])) > WHOLE_BOUND:
            return _texts(column.cast(pa.string()), "text")
        return RawColumn(pd.Series(column.cast(pa.float64()).to_numpy()), "number")
    if pa.types.is_floating(kind) or pa.types.is_decimal(kind):
        numbers = column if pa.types.is_float64(kind) else column.cast(pa.float64())
        return RawColumn(pd.Series(numbers.to_numpy()), "number")
    if pa.types.is_string(kind) or pa.types.is_large_string(kind) or pa.types.is_string_view(kind):
        return _texts(column.cast(pa.string()), "text")
    if pa.types.is_date(kind) or pa.types.is_timestamp(kind) or pa.types.is_time(kind):
        return _texts(_dates(column), "date")
    return _word(kind)


def _dictionary(column: pa.ChunkedArray) -> RawColumn | str:
    values = column.type.value_type
    if not (pa.types.is_string(values) or pa.types.is_large_string(values)):
        return raw_column(column.cast(values))
    unified = column.unify_dictionaries()
    dictionary = unified.chunk(0).dictionary if unified.num_chunks else pa.array([], pa.string())
    codes = [chunk.indices.cast(pa.int64()).fill_null(-1).to_numpy() for chunk in unified.chunks]
    if dictionary.null_count:
        return _texts(column.cast(values).cast(pa.string()), "text")
    return text_column(dictionary, np.concatenate(codes) if codes else np.empty(0, np.intp), "text")


def _texts(column: pa.ChunkedArray, kind: str) -> RawColumn:
    encoded = column.combine_chunks().dictionary_encode()
    if isinstance(encoded, pa.ChunkedArray):
        encoded = encoded.combine_chunks()
    codes = encoded.indices.cast(pa.int64()).fill_null(-1).to_numpy()
    found = text_column(encoded.dictionary, codes, "text")
    if kind == "text":
        return found
    return RawColumn(found.values, "yes-no" if kind == "yes-no" else "date", found.stripped, found.cleaned)


def _dates(column: pa.ChunkedArray) -> pa.ChunkedArray:
    """Dates as texts, without fractions of 0 and without a time of day where every one is midnight."""
    texts = pc.replace_substring_regex(column.cast(pa.string()), NO_FRACTION, r"\1\2")
    if pa.types.is_time(column.type) or not pc.all(pc.match_substring_regex(texts, MIDNIGHT), min_count=0).as_py():
        return texts
    return pc.replace_substring_regex(texts, MIDNIGHT, "")


def _word(kind: pa.DataType) -> str:
    if pa.types.is_list(kind) or pa.types.is_large_list(kind) or pa.types.is_fixed_size_list(kind):
        return "lists"
    if pa.types.is_map(kind) or pa.types.is_struct(kind):
        return "records within records"
    if pa.types.is_duration(kind) or pa.types.is_interval(kind):
        return "lengths of time"
    return "bytes" if "binary" in str(kind) else f"values of type {kind}"
