"""How names, numbers and texts are written in a formula."""

from __future__ import annotations

import keyword

from oddsmodel.records.same_value import same_value_key

RESERVED = frozenset({"Intercept"})


def written_column(column: str) -> str:
    """A column as the formula writes it: bare where it can be, else Q("any name").

    Bare spelling of a column called Intercept is left to the intercept.
    """
    bare = column.isidentifier() and not keyword.iskeyword(column) and column not in RESERVED
    return column if bare else f"Q({written_text(column)})"


def written_text(text: str) -> str:
    """A text between double quotes, as the formula would have to write it."""
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return f'"{escaped}"'


def number_text(value: float) -> str:
    """A number in its shortest spelling: 1, 0.5, 1e-05. Also the level that a number becomes by C(...)."""
    return same_value_key(float(value))
