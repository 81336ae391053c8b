"""A column of numbers: float64, NaN where not recorded, and every value that is no number found by its row."""

from __future__ import annotations

import re
from collections.abc import Collection

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.errors import Fault
from oddsmodel.records.faults import fault
from oddsmodel.records.kinds import is_number, number_mask
from oddsmodel.records.rows import Rows
from oddsmodel.records.same_value import absent_mask
from oddsmodel.wording.plain import quoted

WHOLE_BOUND = 2**53
LONGEST_WHOLE = 400
WHOLE = re.compile(r"[+-]?[0-9]+")
DECIMAL_COMMA = re.compile(r"[+-]?[0-9]+,[0-9]+")


def code_number(
    values: pd.Series, not_recorded: Collection[str], *, where: str, rows: Rows
) -> tuple[NDArray[np.float64], list[Fault]]:
    """The numbers (n,) and the faults: stray texts, infinite values, whole numbers beyond 2^53.

    not_recorded: keys (`same_value_key`) of the texts that mean "not recorded". Faults name their first rows.
    """
    if isinstance(values.dtype, pd.CategoricalDtype):
        return _from_texts(values, not_recorded, where, rows)
    numbers = values.to_numpy(dtype=np.float64)
    codes = [float(key) for key in not_recorded if is_number(key)]
    if codes and (absent := np.isin(numbers, codes)).any():
        numbers = np.where(absent, np.nan, numbers)
    infinite = np.flatnonzero(np.isinf(numbers))
    if len(infinite):
        named, _ = rows.first(infinite)
        return numbers, [fault("number-infinite", where, rows=named, total=rows.total(infinite))]
    return numbers, []


def _from_texts(
    values: pd.Series, not_recorded: Collection[str], where: str, rows: Rows
) -> tuple[NDArray[np.float64], list[Fault]]:
    texts = list(values.cat.categories)
    numeric = number_mask(texts)
    absent = absent_mask(texts, not_recorded)
    parsed = np.full(len(texts) + 1, np.nan)
    parsed[:-1][numeric & ~absent] = [float(text) for text in values.cat.categories[numeric & ~absent]]
    stray = np.append(~numeric & ~absent, False)
    large = np.abs(parsed) >= WHOLE_BOUND
    for position in np.flatnonzero(large):
        text = texts[position]
        large[position] = WHOLE.fullmatch(text) is not None and abs(int(text[:LONGEST_WHOLE])) > WHOLE_BOUND
    codes = np.asarray(values.cat.codes, dtype=np.intp)
    faults: list[Fault] = []
    found = _met(stray, codes, texts, rows)
    if found:
        named, said, total = found
        comma = any(DECIMAL_COMMA.fullmatch(text.strip('"')) for text in said)
        shown = [quoted(text) for text in said]
        faults.append(fault("number-with-text", where, rows=named, values=shown, total=total, comma=comma))
    for code, at in (("number-infinite", np.isinf(parsed)), ("number-too-large", large)):
        found = _met(at, codes, texts, rows)
        if found:
            faults.append(fault(code, where, rows=found[0], total=found[2]))
    return parsed[codes], faults


def _met(
    wanted: NDArray[np.bool_], codes: NDArray[np.intp], texts: list[str], rows: Rows
) -> tuple[list[int], list[str], int] | None:
    """First rows, their texts and the number of rows that hold a wanted text; None where no row does."""
    if not wanted.any():
        return None
    at = np.flatnonzero(wanted[codes])
    if len(at) == 0:
        return None
    named, positions = rows.first(at)
    return named, [texts[codes[position]] for position in positions], rows.total(at)
