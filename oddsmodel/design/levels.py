"""Level pieces of a model matrix: the levels that a factor has among the training records, and who is at which."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from oddsmodel.design.arithmetic import ColumnValue, Expression
from oddsmodel.design.evaluate import evaluate, remembered
from oddsmodel.design.factors import Bands, Coding, Levels, PlainColumn
from oddsmodel.design.faults import piece
from oddsmodel.design.reading import Array, Reader
from oddsmodel.design.words import number_text
from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.faults import fault
from oddsmodel.plan.nearest import nearest
from oddsmodel.records.same_value import matching
from oddsmodel.records.types import Column
from oddsmodel.wording import finding

if TYPE_CHECKING:
    from oddsmodel.design.training import Training

MOST_LEVELS = 500
MOST_POLYNOMIAL = 15
LEVELS_NAMED = 12

LevelFactor = PlainColumn | Bands | Levels


@dataclass(frozen=True)
class ColumnLevels:
    """The levels of a column that has them in the records."""

    column: str

    def codes(self, reader: Reader, levels: tuple[str, ...]) -> NDArray[np.integer]:
        """The place (n,) of each record among the levels; InputFault for any other."""
        return reader.level_codes(self.column, levels)


@dataclass(frozen=True)
class NumberLevels:
    """The values of a number column taken as levels; values (q,) rising, levels (q,) their texts in that order."""

    column: str
    values: Array
    texts: tuple[str, ...]

    def codes(self, reader: Reader, levels: tuple[str, ...]) -> NDArray[np.integer]:
        x = reader.number(self.column)
        place = np.minimum(np.searchsorted(self.values, x), self.values.size - 1)
        other = self.values[place] != x
        if other.any():
            reader.unseen(self.column, other, number_text(float(x[int(np.argmax(other))])))
        if levels == self.texts:
            return place
        return np.array([levels.index(text) for text in self.texts], dtype=np.intp)[place]


@dataclass(frozen=True)
class BandLevels:
    """Bands of a number, each holding its lower edge; texts: all bands from the lowest."""

    expression: Expression
    edges: Array
    texts: tuple[str, ...]
    column: str

    def codes(self, reader: Reader, levels: tuple[str, ...]) -> NDArray[np.integer]:
        band = np.searchsorted(self.edges, evaluate(self.expression, reader), side="right")
        if levels == self.texts:
            return band
        place = {level: number for number, level in enumerate(levels)}
        found = np.array([place.get(text, -1) for text in self.texts], dtype=np.intp)[band]
        if found.size and found.min() < 0:
            which = found < 0
            reader.unseen(self.column, which, self.texts[band[int(np.argmax(which))]])
        return found


LevelSource = ColumnLevels | NumberLevels | BandLevels


@dataclass(frozen=True)
class LevelPiece:
    """Levels with records, in order, the place of the reference among them, and how they are coded.

    scores (levels,): the places of these levels among all that were declared, for polynomial contrasts.
    """

    source: LevelSource
    levels: tuple[str, ...]
    reference: int
    coding: Coding
    scores: tuple[int, ...]

    def codes(self, reader: Reader) -> NDArray[np.integer]:
        return self.source.codes(reader, self.levels)


@dataclass(frozen=True)
class _Declared:
    """Where levels come from, all of them in order, and the reference that the plan prefers."""

    source: LevelSource
    levels: tuple[str, ...]
    reference: str | None = None


def level_piece(factor: LevelFactor, column: Column, training: Training) -> tuple[LevelPiece, tuple[Finding, ...]]:
    """The piece of a factor, and a note for each level that no training record has.

    column: the record column it is made of. Levels and reference are those of the column unless C(...) says otherwise:
    its list of levels begins with the reference. Of numbers and bands the lowest is the reference. InputFault where the
    reference or all but one level are without records, and for levels that do not exist.
    """
    asked = factor if isinstance(factor, Levels) else Levels(factor)
    reader = training.reader
    declared = _declared(asked.source, column, training)
    number = training.at_levels(declared.source, declared.levels).astype(np.int64)
    records = dict(zip(declared.levels, number.tolist(), strict=True))

    order, reference = declared.levels, declared.reference
    if asked.levels is not None:
        order = tuple(_known(level, declared.levels, reader, column) for level in asked.levels)
        for level in declared.levels:
            if level not in order and records[level]:
                facts = {"level": piece(level), "left_out_records": records[level]}
                raise reader.fault("design-levels-left-out", column.name, **facts)
        reference = order[0]
    levels = tuple(level for level in order if records[level])
    if len(levels) < 2:
        raise reader.fault("design-one-level", column.name, level=piece("".join(levels)))
    coding: Coding = asked.coding or "treatment"
    if coding == "polynomial" and len(levels) > MOST_POLYNOMIAL:
        facts = {"term": piece(factor.text), "number": len(levels), "most": MOST_POLYNOMIAL}
        raise InputFault(fault("design-poly-too-many-levels", reader.where, **facts))

    if asked.reference is not None:
        reference = _known(asked.reference, order, reader, column)
    if coding == "treatment" and reference is not None and not records[reference]:
        raise reader.fault("design-reference-absent", column.name, level=piece(reference))
    place = levels.index(reference) if reference in levels else 0
    scores = tuple(order.index(level) for level in levels)
    notes = tuple(
        finding("note", "level-without-records", column=column.name, label=column.label, level=level)
        for level in order
        if not records[level]
    )
    return LevelPiece(declared.source, levels, place, coding, scores), notes


def _declared(source: PlainColumn | Bands, column: Column, training: Training) -> _Declared:
    if isinstance(source, Bands):
        expression = remembered(source.expression, training)
        texts = band_texts(source.edges)
        return _Declared(BandLevels(expression, np.array(source.edges), texts, column.name), texts)
    if column.kind != "number":
        return _Declared(ColumnLevels(source.column), column.levels, column.reference)
    values, _ = training.values(ColumnValue(source.column))
    if values.size > MOST_LEVELS:
        raise training.reader.fault("design-too-many-levels", column.name, most=MOST_LEVELS)
    texts = tuple(number_text(float(value)) for value in values)
    return _Declared(NumberLevels(source.column, values, texts), texts)


def band_texts(edges: tuple[float, ...]) -> tuple[str, ...]:
    """What the bands are called: "under 40", "40 to under 60", "60 and over"."""
    words = [number_text(edge) for edge in edges]
    between = [f"{lower} to under {upper}" for lower, upper in pairwise(words)]
    return (f"under {words[0]}", *between, f"{words[-1]} and over")


def _known(level: str, declared: tuple[str, ...], reader: Reader, column: Column) -> str:
    """The declared level that `level` spells."""
    found = level if level in declared else matching(level, declared)
    if found is None:
        near = nearest(level, declared)
        known = [piece(one) for one in declared[:LEVELS_NAMED]] + (["others"] if len(declared) > LEVELS_NAMED else [])
        facts = {"level": piece(level), "nearest": piece(near) if near else "", "known": known}
        raise reader.fault("design-level-unknown", column.name, **facts)
    return found
