"""What every column of the model matrix is: its term, level, reference, role, unit and wording."""

from __future__ import annotations

import itertools
import math
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass

from oddsmodel.design.arithmetic import ColumnValue, Function
from oddsmodel.design.factors import Bands, Computed, Factor, Levels, PlainColumn
from oddsmodel.design.levels import LevelPiece
from oddsmodel.design.numbers import NumberPiece
from oddsmodel.design.planning import Piece, PlannedBlock, PlannedTerm
from oddsmodel.design.reading import Array
from oddsmodel.design.training import Training, deviation
from oddsmodel.design.types import ColumnKind, DesignColumn, DesignTerm, Role
from oddsmodel.records.types import Column
from oddsmodel.wording import say
from oddsmodel.wording.numbers import listed

INTERCEPT = "Intercept"


@dataclass(frozen=True, slots=True)
class _Part:
    """One column of one factor, before products are taken."""

    name: str
    label: str
    kind: ColumnKind
    level: str | None = None
    reference: str | None = None
    per: float = 1.0
    shown: bool = False


class Describer:
    """Describes the columns of planned terms. training: the training records, for standard deviations."""

    def __init__(
        self,
        factors: Sequence[Factor],
        pieces: Sequence[Piece],
        columns: Mapping[str, Column],
        exposures: Collection[str],
        training: Training,
    ) -> None:
        self.factors, self.pieces, self.columns = factors, pieces, columns
        self.exposures, self.training = frozenset(exposures), training

    def describe(self, planned: Sequence[PlannedTerm]) -> tuple[tuple[DesignColumn, ...], tuple[DesignTerm, ...]]:
        """The columns and terms of the model matrix, in its order."""
        sources = [self.sources(term.factors) for term in planned]
        entered = [name for found in sources for name in found]
        columns: list[DesignColumn] = []
        terms: list[DesignTerm] = []
        for term, found in zip(planned, sources, strict=True):
            start = len(columns)
            alone = all(entered.count(name) == 1 for name in found)
            columns.extend(self.of_term(term, found, alone))
            texts = [self.factors[place].text for place in term.factors]
            name = ":".join(texts) if texts else INTERCEPT
            terms.append(DesignTerm(name, frozenset(texts), found, start, len(columns)))
        return tuple(columns), tuple(terms)

    def sources(self, places: Sequence[int]) -> tuple[str, ...]:
        return tuple(dict.fromkeys(name for place in places for name in self.factors[place].columns))

    def of_term(self, term: PlannedTerm, sources: tuple[str, ...], alone: bool) -> list[DesignColumn]:
        if not term.factors:
            label = say("label-intercept")
            return [DesignColumn(INTERCEPT, INTERCEPT, (), "intercept", "intercept", label, shown=False)]
        name = ":".join(self.factors[place].text for place in term.factors)
        role: Role = "exposure" if self.exposures.intersection(sources) else "adjustment"
        made = []
        for block in term.blocks:
            parts = [self.parts(place, matrix) for place, matrix in zip(block.factors, block.contrasts, strict=True)]
            for combined in combinations(parts):
                if len(term.factors) == 1:
                    made.append(self.single(combined[0], name, sources, role, alone))
                else:
                    made.append(self.product(combined, block, name, sources, role))
        return made

    def single(self, part: _Part, term: str, sources: tuple[str, ...], role: Role, alone: bool) -> DesignColumn:
        return DesignColumn(
            part.name,
            term,
            sources,
            part.kind,
            role,
            part.label,
            level=part.level,
            reference=part.reference,
            per=part.per,
            shown=part.shown and alone,
        )

    def product(
        self, parts: tuple[_Part, ...], block: PlannedBlock, term: str, sources: tuple[str, ...], role: Role
    ) -> DesignColumn:
        levels: dict[str, str | None] = dict.fromkeys(sources)
        for place, part in zip(block.factors, parts, strict=True):
            if part.level is not None:
                levels[self.factors[place].columns[0]] = part.level
        name = " × ".join(part.name for part in parts)
        label = " × ".join(part.label for part in parts)
        per = math.prod(part.per for part in parts)
        return DesignColumn(name, term, sources, "interaction", role, label, levels=levels, per=per, shown=False)

    def parts(self, place: int, contrast: Array | None) -> list[_Part]:
        """The columns of one factor; contrast: the matrix of its levels, None for a number."""
        factor, piece = self.factors[place], self.pieces[place]
        if isinstance(piece, LevelPiece):
            assert contrast is not None
            return self.of_levels(factor, piece, full=contrast.shape[1] == len(piece.levels))
        return self.of_numbers(factor, piece)

    def of_levels(self, factor: Factor, piece: LevelPiece, full: bool) -> list[_Part]:
        label = self.label(factor)
        if piece.coding == "polynomial":
            degrees = range(0 if full else 1, len(piece.levels))
            return [
                _Part(f"{factor.text}, degree {d}", say("label-polynomial", label=label, degree=d), "contrast")
                for d in degrees
            ]
        if piece.coding == "sum":
            mean = [_Part(f"{factor.text}: mean", say("label-mean", label=label), "contrast")] if full else []
            return mean + [
                _Part(
                    f"{factor.text}: {level}",
                    say("label-against-mean", label=label, level=level),
                    "contrast",
                    level=level,
                )
                for level in piece.levels[:-1]
            ]
        reference = None if full else piece.levels[piece.reference]
        return [
            _Part(
                f"{factor.text}: {level}",
                say("label-level", label=label, level=level, reference=reference),
                "level",
                level=level,
                reference=reference,
                shown=not full,
            )
            for level in piece.levels
            if level != reference
        ]

    def of_numbers(self, factor: Factor, piece: NumberPiece) -> list[_Part]:
        label = self.label(factor)
        if piece.basis is not None:
            return [
                _Part(f"{factor.text}, part {part}", say("label-spline-part", label=label, part=part), "transform")
                for part in range(1, piece.width + 1)
            ]
        if isinstance(factor, PlainColumn):
            return [self.of_number(factor.text, factor.column, "number")]
        assert isinstance(factor, Computed)
        made, name = factor.expression, factor.text
        if isinstance(made, Function) and isinstance(made.argument, ColumnValue):
            if made.name == "center":
                return [self.of_number(name, made.argument.column, "transform")]
            if made.name == "standardize":
                deviation = self.deviation(made.argument.column, lost=0)
                words = self.deviation_label(made.argument.column, deviation)
                return [_Part(name, words, "transform", shown=True)]
            if made.name in ("log", "log2", "log10"):
                return [_Part(name, say(f"label-{made.name}", label=label), "transform", shown=True)]
        return [_Part(name, say("label-computed", term=name), "transform", shown=True)]

    def of_number(self, name: str, source: str, kind: ColumnKind) -> _Part:
        column = self.columns[source]
        if isinstance(column.per, str):
            deviation = column.deviation or self.deviation(source, lost=1)
            return _Part(name, self.deviation_label(source, deviation), kind, per=deviation, shown=True)
        per = float(column.per)
        label = say("label-number", label=column.label, per=per, units=column.units)
        return _Part(name, label, kind, per=per, shown=True)

    def deviation_label(self, source: str, deviation: float) -> str:
        column = self.columns[source]
        return say("label-deviation", label=column.label, deviation=deviation, units=column.units)

    def deviation(self, source: str, *, lost: int) -> float:
        """The training standard deviation of a column; InputFault where it is 0."""
        found = deviation(self.training, source, lost=lost)
        if found == 0.0:
            raise self.training.reader.fault("design-constant", source, term=source)
        return found

    def label(self, factor: Factor) -> str:
        """What the factor's column is called; a function's own words where it is made of several."""
        labels = [self.columns[name].label for name in factor.columns]
        return labels[0] if isinstance(factor, Bands | Levels | PlainColumn) else listed(labels)


def combinations(parts: Sequence[Sequence[_Part]]) -> list[tuple[_Part, ...]]:
    """One of each, the first running fastest."""
    return [chosen[::-1] for chosen in itertools.product(*reversed(parts))]
