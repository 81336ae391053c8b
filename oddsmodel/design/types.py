"""What the design floor hands over: a plain, picklable description of the model matrix."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

Role = Literal["intercept", "exposure", "adjustment"]
ColumnKind = Literal["intercept", "level", "number", "contrast", "transform", "interaction"]


@dataclass(frozen=True, slots=True)
class DesignColumn:
    """One column of the model matrix.

    term: the term in the formula's own words ("smoker", "rcs(age, 4)", "smoker:sex"); "Intercept" for it.
    sources: the record columns it is made from, in order.
    kind: "level" is an indicator of a level against a reference (treatment contrasts), "number" an untransformed
        number column, "contrast" a column of another coding (sum, polynomial), "transform" a function or spline of
        numbers, "interaction" a product of several.
    level, reference: for kind "level".
    levels: for an interaction, each source column with its level (None for a number).
    per: one coefficient times `per` is the log odds ratio that is reported (that of a
        number column, alone or in a product; 1.0 for all else).
    label: the wording of the coefficient ("Smoking: current against never", "Age, per 10 years").
    shown: whether its own odds ratio has a meaning: a "level" column with a reference, a "number" column or the one
        column of a function of numbers, whose sources enter no interaction, spline or further term.
    """

    name: str
    term: str
    sources: tuple[str, ...]
    kind: ColumnKind
    role: Role
    label: str
    level: str | None = None
    reference: str | None = None
    levels: Mapping[str, str | None] | None = None
    per: float = 1.0
    shown: bool = True


@dataclass(frozen=True, slots=True)
class DesignTerm:
    """A term and the half-open range [start, stop) of its columns in the matrix; `factors` are those of the formula."""

    name: str
    factors: frozenset[str]
    sources: tuple[str, ...]
    start: int
    stop: int

    def contains(self, other: DesignTerm) -> bool:
        """Whether this term contains all factors of another (itself included): the order of marginality."""
        return other.factors <= self.factors
