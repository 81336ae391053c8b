"""The decimal comma: recognised where another character separates the fields, refused where it is ambiguous."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Iterator

import pyarrow as pa
import pyarrow.compute as pc

from oddsmodel.errors import InputFault
from oddsmodel.records.faults import fault, in_column

COMMA = r"^\s*[+-]?[0-9]+,[0-9]+\s*$"
POINT = r"^\s*[+-]?[0-9]+\.[0-9]+\s*$"
BOTH = r"^\s*[+-]?[0-9]{1,3}(?:(?:\.[0-9]{3})+,[0-9]+|(?:,[0-9]{3})+\.[0-9]+)\s*$"
THOUSANDS = r"^\s*[+-]?[1-9][0-9]{0,2}(?:,[0-9]{3})+\s*$"
EITHER = r"^\s*[+-]?[0-9]*[.,]?[0-9]+\s*$"


Texts = Iterable[tuple[str, pa.ChunkedArray]]
"""The names of text columns and their different texts."""


def has_decimal_commas(columns: Texts, source: str) -> bool:
    """Whether a column has numbers written with a comma.

    Raises: InputFault when every one of them can as well be a whole number with its thousands marked off.
    """
    found = [
        (name, texts.filter(pc.match_substring_regex(texts, COMMA)))
        for name, texts in columns
        if _share(texts, EITHER) >= 0.5
    ]
    written = [(name, texts) for name, texts in found if len(texts)]
    if written and all(_share(texts, THOUSANDS) == 1.0 for _, texts in written):
        raise InputFault([fault("decimal-mark-ambiguous", in_column(source, name)) for name, _ in written])
    return bool(written)


def refuse_ambiguous(columns: Texts, source: str) -> None:
    """Refuse columns, read with the decimal comma, of which some speaks for the decimal point.

    Raises: InputFault naming each column that has both spellings, or thousands marked off.
    """
    faults = [
        fault("decimal-mark-ambiguous", in_column(source, name))
        for name, texts in columns
        if _share(texts, EITHER) >= 0.5 and (_share(texts, POINT) > 0 or _share(texts, BOTH) > 0)
    ]
    if faults:
        raise InputFault(faults)


def different_texts(table: pa.Table, apart: Collection[str]) -> Iterator[tuple[str, pa.ChunkedArray]]:
    """The different texts of each text column, other than those kept apart as text."""
    for name in table.column_names:
        if pa.types.is_dictionary(table[name].type) and name not in apart:
            chunks = [chunk.dictionary for chunk in table[name].chunks]
            texts = pa.chunked_array(chunks, type=pa.string())
            yield name, texts.filter(pc.not_equal(texts, ""))


def _share(texts: pa.ChunkedArray, pattern: str) -> float:
    """Share of the texts that the pattern matches; none of none is 0."""
    if len(texts) == 0:
        return 0.0
    return float(pc.sum(pc.match_substring_regex(texts, pattern)).as_py() or 0) / len(texts)
