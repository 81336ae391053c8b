"""What a column is, where the plan does not say it."""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np
import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from oddsmodel.plan.schema import ColumnSection, Kind
from oddsmodel.records.raw import RawType
from oddsmodel.records.rows import Weights, occurrences
from oddsmodel.records.same_value import yes_or_no

NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?")
DATE = re.compile(
    r"[0-9]{4}[-/.][0-9]{1,2}[-/.][0-9]{1,2}(?:[T ][0-9:.+Z-]+)?|[0-9]{1,2}[-/.][0-9]{1,2}[-/.](?:[0-9]{2}|[0-9]{4})"
)
SPELLED_TYPES: dict[RawType, Kind] = {
    "number": "number",
    "yes-no": "yes-no",
    "date": "date",
    "category": "category",
    "ordered": "ordered",
    "empty": "category",
}
FEWEST_FOR_IDENTIFIER = 50
FEWEST_NUMBERS = 10
MOSTLY = 0.9


def kind_of(
    values: pd.Series, raw_type: RawType, section: ColumnSection | None, weights: Weights | None = None
) -> Kind:
    """The kind by the plan, by the keys that the plan gives the column, or by its values (not recorded: NaN).

    weights (n,): rows that each value stands for.
    """
    kind = kind_by_plan(section, raw_type)
    if kind is not None:
        return kind
    return kind_of_texts(values, weights) if raw_type == "text" else SPELLED_TYPES[raw_type]


def kind_by_plan(section: ColumnSection | None, raw_type: RawType = "text") -> Kind | None:
    """The kind by the plan, or by the keys that the plan gives the column; None where these leave it open."""
    if section is None or section.kind is not None:
        return None if section is None else section.kind
    if section.levels is not None or section.reference is not None:
        return "ordered" if raw_type == "ordered" else "category"
    if not (section.per is None and section.units is None and section.plausible is None):
        return "number"
    return None


def kind_of_texts(values: pd.Series, weights: Weights | None = None) -> Kind:
    """The kind of a column of texts.

    Numbers if nine in ten records hold one and more than ten different ones are met: the others are then stray
    texts. An identifier if no text is met twice in fifty records or more.
    """
    counts = occurrences(np.asarray(values.cat.codes, dtype=np.intp), len(values.cat.categories), weights)
    texts = list(values.cat.categories[counts > 0])
    counts = counts[counts > 0]
    if not texts:
        return "category"
    sample = texts[:1000]
    if sum(DATE.fullmatch(text) is not None for text in sample) >= MOSTLY * len(sample):
        return "date"
    numeric = number_mask(texts)
    if numeric.all():
        return "category" if any(_leading_zero(text) for text in texts) else "number"
    if len(texts) <= 8 and {yes_or_no(text) for text in texts} == {"yes", "no"}:
        return "yes-no"
    if numeric.sum() > FEWEST_NUMBERS and counts[numeric].sum() >= MOSTLY * counts.sum():
        return "number"
    once = len(texts) == counts.sum() and len(texts) >= FEWEST_FOR_IDENTIFIER
    return "identifier" if once else "category"


def number_mask(texts: Sequence[str]) -> NDArray[np.bool_]:
    """Which texts (k,) are numbers: digits with at most one decimal point, a sign, an exponent."""
    matched = pc.match_substring_regex(pa.array(texts, pa.string()), f"^(?:{NUMBER.pattern})$")
    return np.asarray(matched.to_numpy(zero_copy_only=False), dtype=np.bool_)


def is_number(text: str) -> bool:
    return NUMBER.fullmatch(text) is not None


def _leading_zero(text: str) -> bool:
    digits = text.lstrip("+-")
    return len(digits) > 1 and digits[0] == "0" and digits[1].isdigit()
