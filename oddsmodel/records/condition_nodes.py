"""The parts of a `keep` condition, decided in three values (true, false, cannot be decided)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import reduce
from typing import Protocol

import numpy as np
import pandas as pd
from numpy.typing import NDArray

Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Rows:
    """The rows that a condition is asked of; `outside` as in `Records.outside_levels`."""

    frame: pd.DataFrame
    outside: Mapping[str, pd.Series] = field(default_factory=dict)

    def outside_of(self, column: str) -> Mask:
        """Rows (n,) with a recorded level that is not in the plan."""
        if column in self.outside:
            return self.outside[column].to_numpy(dtype=np.bool_)
        return np.zeros(len(self.frame), dtype=np.bool_)

    def recorded(self, column: str) -> Mask:
        return np.asarray(self.frame[column].notna().to_numpy(), dtype=np.bool_) | self.outside_of(column)


class Node(Protocol):
    """A part of a condition: where it holds (n,) and where it is false (n,); elsewhere it is undecided."""

    def evaluate(self, rows: Rows) -> tuple[Mask, Mask]: ...


@dataclass(frozen=True, slots=True)
class Operand:
    """A number column, or a number."""

    column: str | None
    number: float = 0.0

    def values(self, frame: pd.DataFrame) -> NDArray[np.float64]:
        if self.column is None:
            return np.full(len(frame), self.number)
        return frame[self.column].to_numpy(dtype=np.float64)


@dataclass(frozen=True, slots=True)
class NumberComparison:
    left: Operand
    sign: str
    right: Operand

    def evaluate(self, rows: Rows) -> tuple[Mask, Mask]:
        left, right = self.left.values(rows.frame), self.right.values(rows.frame)
        decided = ~(np.isnan(left) | np.isnan(right))
        with np.errstate(invalid="ignore"):
            holds = COMPARE[self.sign](left, right)
        return holds & decided, ~holds & decided


@dataclass(frozen=True, slots=True)
class NumberAmong:
    column: str
    numbers: tuple[float, ...]

    def evaluate(self, rows: Rows) -> tuple[Mask, Mask]:
        values = rows.frame[self.column].to_numpy(dtype=np.float64)
        decided, among = ~np.isnan(values), np.isin(values, self.numbers)
        return among & decided, ~among & decided


@dataclass(frozen=True, slots=True)
class LevelAmong:
    """Whether a column's level is one of some; every comparison of levels comes to this."""

    column: str
    levels: tuple[str, ...]

    def evaluate(self, rows: Rows) -> tuple[Mask, Mask]:
        series = rows.frame[self.column]
        wanted = np.append(np.isin(np.asarray(series.cat.categories, dtype=object), self.levels), False)
        among = wanted[np.asarray(series.cat.codes, dtype=np.intp)]
        return among, ~among & rows.recorded(self.column)


@dataclass(frozen=True, slots=True)
class IsRecorded:
    column: str

    def evaluate(self, rows: Rows) -> tuple[Mask, Mask]:
        recorded = rows.recorded(self.column)
        return recorded, ~recorded


@dataclass(frozen=True, slots=True)
class Not:
    part: Node

    def evaluate(self, rows: Rows) -> tuple[Mask, Mask]:
        holds, fails = self.part.evaluate(rows)
        return fails, holds


@dataclass(frozen=True, slots=True)
class AllOf:
    """True where every part is, false where any part is (Kleene 1952, section 64)."""

    parts: tuple[Node, ...]

    def evaluate(self, rows: Rows) -> tuple[Mask, Mask]:
        answers = [part.evaluate(rows) for part in self.parts]
        return (
            reduce(np.logical_and, [holds for holds, _ in answers]),
            reduce(np.logical_or, [fails for _, fails in answers]),
        )


@dataclass(frozen=True, slots=True)
class AnyOf:
    """True where any part is, false where every part is (Kleene 1952, section 64)."""

    parts: tuple[Node, ...]

    def evaluate(self, rows: Rows) -> tuple[Mask, Mask]:
        holds, fails = Not(AllOf(tuple(Not(part) for part in self.parts))).evaluate(rows)
        return holds, fails


@dataclass(frozen=True, slots=True)
class Condition:
    """A vetted condition. columns: the record columns it asks about, in order."""

    text: str
    columns: tuple[str, ...]
    node: Node

    def evaluate(self, frame: pd.DataFrame, outside: Mapping[str, pd.Series] | None = None) -> tuple[Mask, Mask]:
        """Where the condition holds (n,), and where it is decided at all (n,).

        A comparison with a value that is not recorded is undecided; a level that is not in the plan (`outside`)
        is recorded, and is none of the plan's levels.
        """
        holds, fails = self.node.evaluate(Rows(frame, outside or {}))
        return holds, holds | fails


COMPARE = {
    "==": np.equal,
    "!=": np.not_equal,
    "<": np.less,
    "<=": np.less_equal,
    ">": np.greater,
    ">=": np.greater_equal,
}
