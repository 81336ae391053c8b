"""Texts at the door: dictionary codes to a clean categorical."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from oddsmodel.records.raw import RawColumn, RawType
from oddsmodel.records.rows import Weights, occurrences

NOT_SHOWN = r"[\x00-\x1f\x7f-\x{9f}\x{200b}\x{202a}-\x{202e}\x{2066}-\x{2069}\x{feff}]+"


def without_texts(values: pd.Series, absent: NDArray[np.bool_]) -> pd.Series:
    """A categorical whose categories marked absent (k,) are taken out; their rows become not recorded."""
    if not absent.any():
        return values
    position = np.append(np.where(absent, -1, np.cumsum(~absent) - 1), -1)
    codes = position[np.asarray(values.cat.codes, dtype=np.intp)]
    return pd.Series(pd.Categorical.from_codes(codes, categories=values.cat.categories[~absent]))


def clean_texts(texts: pa.Array) -> tuple[pa.Array, NDArray[np.bool_], NDArray[np.bool_]]:
    """Texts as `text_column` cleans them, which of them had spaces around, and which had characters not to be shown."""
    trimmed = pc.utf8_trim_whitespace(texts)
    shown = pc.utf8_trim_whitespace(pc.replace_substring_regex(trimmed, NOT_SHOWN, " "))
    had_spaces = np.asarray(pc.not_equal(texts, trimmed).to_numpy(zero_copy_only=False), dtype=np.bool_)
    had_unseen = np.asarray(pc.not_equal(trimmed, shown).to_numpy(zero_copy_only=False), dtype=np.bool_)
    return pc.utf8_normalize(shown, form="NFC"), had_spaces, had_unseen


def text_column(
    dictionary: pa.Array, codes: NDArray[np.intp], kind: RawType, weights: Weights | None = None
) -> RawColumn:
    """A column of texts from its different texts and a code for each cell (n,), -1 for an empty one.

    weights (n,): how many rows have the cell, where it is not one.

    Spaces around a text go; runs of control and direction-changing characters become one space (they could make
    a text look like another one); composed and decomposed accents are one (Unicode NFC). A text of which nothing
    remains is an empty cell; texts that come out alike, as of 1 and "1" in one column, are one.
    """
    texts = dictionary.cast(pa.string())
    clean, had_spaces, had_unseen = clean_texts(texts)
    counts = occurrences(codes, len(texts), weights)
    stripped, cleaned = int(counts[had_spaces].sum()), int(counts[had_unseen].sum())
    if not clean.equals(texts) or pc.any(pc.equal(clean, "")).as_py() or len(pc.unique(clean)) < len(clean):
        merged = clean.dictionary_encode()
        clean = merged.dictionary
        remaining = pc.not_equal(clean, "").to_numpy(zero_copy_only=False)
        position = np.where(remaining, np.cumsum(remaining) - 1, -1)
        clean = clean.filter(pa.array(remaining))
        codes = np.append(position[merged.indices.to_numpy()], -1)[codes]
    categories = pd.Index(clean.to_pylist(), dtype=object)
    values = pd.Series(pd.Categorical.from_codes(codes, categories=categories))
    return RawColumn(values, kind, stripped=stripped, cleaned=cleaned)
