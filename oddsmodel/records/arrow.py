"""Arrow columns of every plain type to raw columns; nested ones are refused."""

from __future__ import annotations

from typing import Literal

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from oddsmodel.records.raw import RawColumn, RawType
from oddsmodel.records.rows import Weights
from oddsmodel.records.texts import text_column

WHOLE_BOUND = 2**53
NO_FRACTION = r"(:[0-9]{2})\.0+(Z|$)"
MIDNIGHT = r"[ T]00:00(:00(\.0+)?)?$"
Holds = Literal["numbers", "whole numbers", "texts", "yes-no", "dates", "nothing", "no plain values"]
RAW_TYPES: dict[Holds, RawType] = {"yes-no": "yes-no", "dates": "date"}


def raw_column(column: pa.ChunkedArray, weights: Weights | None = None) -> RawColumn | str:
    """The column as numbers or texts, or, where it is neither, the word for what it holds.

    Whole numbers beyond 2^53 cannot be told apart as float64: they are kept as texts. Dates are texts. weights (n,):
    how many rows have the cell, where it is not one.
    """
    column = plain_values(column)
    holds = what_it_holds(column.type)
    if holds == "no plain values":
        return word_for(column.type)
    if holds == "nothing":
        return RawColumn(pd.Series(np.full(len(column), np.nan)), "empty")
    if holds == "numbers" or (holds == "whole numbers" and not beyond_whole_bound(column)):
        return RawColumn(pd.Series(as_numbers(column)), "number")
    dictionary, codes = different_values(column)
    texts = as_texts(dictionary, days_only=holds == "dates" and has_midnights_only(dictionary))
    return text_column(texts, codes, RAW_TYPES.get(holds, "text"), weights)


def plain_values(column: pa.ChunkedArray) -> pa.ChunkedArray:
    """The column without the types that stand for others: extensions, dictionaries of anything but texts."""
    kind = column.type
    if isinstance(kind, pa.BaseExtensionType):
        return plain_values(pa.chunked_array([chunk.storage for chunk in column.chunks], type=kind.storage_type))
    if pa.types.is_dictionary(kind) and what_it_holds(kind.value_type) != "texts":
        return plain_values(column.cast(kind.value_type))
    return column


def what_it_holds(kind: pa.DataType) -> Holds:
    """What the values of a type are here; a dictionary of texts holds texts."""
    if pa.types.is_dictionary(kind):
        kind = kind.value_type
    if pa.types.is_null(kind):
        return "nothing"
    if pa.types.is_boolean(kind):
        return "yes-no"
    if pa.types.is_integer(kind) or (pa.types.is_decimal(kind) and kind.scale <= 0):
        return "whole numbers"
    if pa.types.is_floating(kind) or pa.types.is_decimal(kind):
        return "numbers"
    if pa.types.is_string(kind) or pa.types.is_large_string(kind) or pa.types.is_string_view(kind):
        return "texts"
    if pa.types.is_date(kind) or pa.types.is_timestamp(kind) or pa.types.is_time(kind):
        return "dates"
    return "no plain values"


def beyond_whole_bound(column: pa.ChunkedArray) -> bool:
    """Whether whole numbers are met that float64 cannot tell apart."""
    bounds = pc.min_max(column).as_py()
    return bounds["max"] is not None and max(abs(bounds["min"]), abs(bounds["max"])) > WHOLE_BOUND


def as_numbers(column: pa.ChunkedArray) -> NDArray[np.float64]:
    """The numbers (n,), NaN for an empty cell."""
    numbers = column if pa.types.is_float64(column.type) else column.cast(pa.float64())
    return np.asarray(numbers.to_numpy(), dtype=np.float64)


def different_values(column: pa.ChunkedArray) -> tuple[pa.Array, NDArray[np.intp]]:
    """The different values and the code of each cell (n,) among them, -1 where it is empty.

    They come in the order in which they are met, or in that of a dictionary that the column has.
    """
    if pa.types.is_dictionary(column.type):
        unified = column.unify_dictionaries()
        dictionary = unified.chunk(0).dictionary if unified.num_chunks else pa.array([], column.type.value_type)
        if not dictionary.null_count:
            codes = [chunk.indices.cast(pa.int64()).fill_null(-1).to_numpy() for chunk in unified.chunks]
            return dictionary, np.concatenate(codes) if codes else np.empty(0, np.intp)
        column = column.cast(column.type.value_type)
    elif pa.types.is_string_view(column.type):
        column = column.cast(pa.string())
    encoded = column.combine_chunks().dictionary_encode()
    if isinstance(encoded, pa.ChunkedArray):
        encoded = encoded.combine_chunks()
    return encoded.dictionary, encoded.indices.cast(pa.int64()).fill_null(-1).to_numpy()


def has_midnights_only(moments: pa.Array) -> bool:
    """Whether all of some dates and moments are midnights."""
    if pa.types.is_time(moments.type):
        return False
    texts = moments.cast(pa.string())
    return bool(pc.all(pc.match_substring_regex(texts, MIDNIGHT), min_count=0).as_py())


def as_texts(values: pa.Array, *, days_only: bool) -> pa.Array:
    """Values as texts: moments without fractions of 0 and, with `days_only`, without the time of day."""
    texts = values.cast(pa.string())
    if what_it_holds(values.type) != "dates":
        return texts
    texts = pc.replace_substring_regex(texts, NO_FRACTION, r"\1\2")
    return pc.replace_substring_regex(texts, MIDNIGHT, "") if days_only else texts


def word_for(kind: pa.DataType) -> str:
    """The word for values that are not plain."""
    if pa.types.is_list(kind) or pa.types.is_large_list(kind) or pa.types.is_fixed_size_list(kind):
        return "lists"
    if pa.types.is_map(kind) or pa.types.is_struct(kind):
        return "records within records"
    if pa.types.is_duration(kind) or pa.types.is_interval(kind):
        return "lengths of time"
    return "bytes" if "binary" in str(kind) else f"values of type {kind}"
