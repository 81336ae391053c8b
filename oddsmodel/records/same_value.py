"""When two spellings are one value: "1", 1, 1.0 and true are the same, "01" and "1" are not."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Collection, Iterable, Sequence
from decimal import Decimal
from typing import Literal

import numpy as np
from numpy.typing import NDArray

PLAIN_NUMBER = re.compile(r"[+-]?(?:(?:0|[1-9][0-9]*)(?:\.[0-9]*)?|\.[0-9]+)")
LONGEST_NUMBER = 300
TRUTH = {"true": "1", "false": "0"}
YES_OR_NO: dict[str, Literal["yes", "no"]] = {"1": "yes", "yes": "yes", "y": "yes", "0": "no", "no": "no", "n": "no"}


def same_value_key(value: object) -> str:
    """The text by which equal values are recognised.

    Numbers in any plain spelling share a key, as do 1 and true, 0 and false (in any case). A text with leading
    zeros or an exponent is a code, not a number, and is its own key. Spaces around a text do not count.
    """
    if isinstance(value, bool | np.bool_):
        return "1" if value else "0"
    if isinstance(value, int | np.integer):
        return str(int(value))
    if isinstance(value, float | np.floating | Decimal):
        return _number_key(float(value))
    text = unicodedata.normalize("NFC", str(value)).strip()
    if len(text) <= LONGEST_NUMBER and PLAIN_NUMBER.fullmatch(text):
        return _number_key(float(text)) if "." in text else str(int(text))
    return TRUTH.get(text.casefold(), text)


def _number_key(number: float) -> str:
    return str(int(number)) if number.is_integer() else repr(number)


def yes_or_no(value: object) -> Literal["yes", "no"] | None:
    """ "yes" for yes, y, true and 1, "no" for no, n, false and 0 (in any case), None for anything else."""
    return YES_OR_NO.get(same_value_key(value).casefold())


def is_yes_no_pair(values: Iterable[object]) -> bool:
    """Whether the values are one that says yes and one that says no."""
    said = [yes_or_no(value) for value in values]
    return len(said) == 2 and set(said) == {"yes", "no"}


def matching(value: object, candidates: Iterable[str]) -> str | None:
    """The candidate that is the same value, or None.

    Between a yes and a no, every spelling of yes and no is recognised: 1 matches "yes" in ("no", "yes").
    """
    offered = tuple(candidates)
    key = same_value_key(value)
    for candidate in offered:
        if same_value_key(candidate) == key:
            return candidate
    said = yes_or_no(value)
    if said is not None and is_yes_no_pair(offered):
        return next(candidate for candidate in offered if yes_or_no(candidate) == said)
    return None


def absent_mask(texts: Sequence[str], not_recorded: Collection[str]) -> NDArray[np.bool_]:
    """Which of the texts (k,) mean "not recorded"; `not_recorded` are the keys of the texts that do."""
    if any(PLAIN_NUMBER.fullmatch(key) for key in not_recorded):
        found = [same_value_key(text) in not_recorded for text in texts]
    else:
        found = [text in not_recorded for text in texts]
    return np.asarray(found, dtype=np.bool_)
