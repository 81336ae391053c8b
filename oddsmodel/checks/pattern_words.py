"""Covariate patterns in words, without anybody's own value."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.rows import COLUMN, Encode
from oddsmodel.passes import Leaf
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain

LONGEST_PATTERN = 300


def in_words(model: FittedModel, positions: NDArray[np.int64]) -> list[str]:
    """The values of the record columns in a few rows; a column whose value differs within one says only that.

    A pattern of the model matrix may hold records of several values of a column that the formula cuts into bands; the
    first record's own value is nobody's business. A row that is a single record has one value of each.
    """
    sources = list(dict.fromkeys(source for column in model.design.columns for source in column.sources))
    values = model.rows.columns_at(positions)
    several = _several(model, positions, [source for source in sources if not _settled(model, source)])
    words: list[str] = []
    for j in range(positions.size):
        parts = []
        for source in sources:
            value = say("influence-several-values") if (j, source) in several else _in_words(values[source].iloc[j])
            parts.append(f"{model.columns[source].label}: {value}")
        words.append(plain(", ".join(parts), LONGEST_PATTERN))
    return words


def _in_words(value: object) -> str:
    return f"{value:g}" if isinstance(value, float | np.floating) else str(value)


def _settled(model: FittedModel, source: str) -> bool:
    """Whether records with equal rows of the model matrix have the same value of a record column for certain."""
    kinds = ("number",) if model.columns[source].kind == "number" else ("level", "contrast")
    return any(column.sources == (source,) and column.kind in kinds for column in model.design.columns)


@dataclass(frozen=True)
class _Differing:
    """The work on records: the columns in which those of some rows X (k, p) differ from given ones, with the row."""

    encode: Encode
    X: NDArray[np.float64]
    given: Leaf

    def __call__(self, rows: Leaf, first: int, state: None) -> set[tuple[int, str]]:
        X = self.encode(rows)["X"]
        found = set()
        for j, row in enumerate(self.X):
            own = np.flatnonzero((row == X).all(axis=1))
            found |= {(j, name) for name, known in self.given.items() if (rows[name][own] != known[j]).any()}
        return found


def _several(model: FittedModel, positions: NDArray[np.int64], sources: list[str]) -> set[tuple[int, str]]:
    """The columns of which a few patterns hold several values, found in a pass over all records."""
    people, first_row = model.rows.people, model.rows.first_row
    if first_row is None or not sources:
        return set()
    encode = Encode(model.design, model.rows.levels)
    records = people.taken(first_row[positions].tolist())
    given = {COLUMN + source: records[COLUMN + source] for source in sources}
    found: set[tuple[int, str]] = set()
    for some in people.each(_Differing(encode, encode(records)["X"], given)):
        found |= some
    return {(j, name[len(COLUMN) :]) for j, name in found}
