"""A column made from others, cross-counted with what it was made from."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class DerivedCount:
    """Records with one value of the derived column, of one of its sources, or of both.

    value, source, source_value: the derived value, the label of the source and its value; "" where the count is not
    told apart by it. smallest, largest: of the source in these records where one is named, else of the derived column;
    a date stands with its calendar year. lower, upper: the edges of a band, between which both lie.
    """

    value: str
    source: str
    source_value: str
    records: int | None
    smallest: float | None = None
    largest: float | None = None
    lower: float | None = None
    upper: float | None = None


@dataclass(frozen=True, slots=True)
class DerivedColumn:
    """How a column was made: its rule in words, its sources, cut points found in the records, and the cross-counts.

    counts: over all records read. rounded_to: what disclosure rounded the counts to, None where they are exact.
    """

    name: str
    label: str
    kind: str
    rule: str
    sources: tuple[str, ...]
    counts: tuple[DerivedCount, ...]
    cut_points: tuple[float, ...] = ()
    rounded_to: int | None = None
