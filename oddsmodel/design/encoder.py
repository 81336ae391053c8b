"""A design: a plain, picklable description of a model matrix that encodes any frame with the same columns."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.coded import CodedRows
from oddsmodel.design.describe import Describer
from oddsmodel.design.factors import Bands, CubicSpline, Factor, Levels, PlainColumn
from oddsmodel.design.faults import formula_fault, piece
from oddsmodel.design.formula import VettedFormula
from oddsmodel.design.levels import LevelPiece, level_piece
from oddsmodel.design.numbers import NumberPiece, number_piece
from oddsmodel.design.planning import Piece, PlannedBlock, plan_terms
from oddsmodel.design.reading import Array, Reader
from oddsmodel.design.training import FrameTraining, Training
from oddsmodel.design.types import DesignColumn, DesignTerm
from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.faults import fault
from oddsmodel.records.types import Column
from oddsmodel.wording import finding

MOST_COLUMNS = 500
ROWS_AT_ONCE = 16_384
"""So many rows of the matrix are filled at a time that they stay in the processor's cache."""

NOT_FOR_MODELS = ("identifier", "date")


@dataclass(frozen=True, eq=False)
class Block:
    """Columns [start, stop) of the matrix: products of a column of each factor.

    factors: their places among the pieces. contrasts: for each the matrix of its levels, None for a number.
    choices: for each factor the column (stop − start,) that it gives to each product.
    """

    factors: tuple[int, ...]
    contrasts: tuple[Array | None, ...]
    choices: tuple[NDArray[np.intp], ...]
    start: int
    stop: int

    def fill(self, out: Array, read: Sequence[NDArray[Any]], rows: slice) -> None:
        """Write the block's columns for some rows; read: for each piece the places of levels or the numbers."""
        if not self.factors:
            out[...] = 1.0
        for number, (place, contrast, choice) in enumerate(
            zip(self.factors, self.contrasts, self.choices, strict=True)
        ):
            part = read[place][rows] if contrast is None else contrast.take(read[place][rows], axis=0)
            if len(self.factors) > 1:
                part = part.take(choice, axis=1)
            if number:
                out *= part
            else:
                out[...] = part


@dataclass(frozen=True, eq=False)
class Design:
    """columns, terms: what the model matrix holds, in its order. findings: what the training records gave cause to say.

    Everything that the training records settled is kept (levels, contrasts, knots, means, deviations), so that
    another frame is encoded in the same way. Holds no record.
    """

    columns: tuple[DesignColumn, ...]
    terms: tuple[DesignTerm, ...]
    findings: tuple[Finding, ...]
    pieces: tuple[Piece, ...]
    blocks: tuple[Block, ...]
    where: str

    def encode(self, frame: pd.DataFrame | CodedRows) -> Array:
        """The model matrix (n, p) of n records: float64, in C order (a record's columns side by side).

        Splines go on as straight lines beyond the range of the training records. InputFault where a column is not
        recorded, has a level that the training records did not have, or where a function has no value.
        """
        return self.matrix(self.read(frame), len(frame))

    def matrix(self, read: Sequence[NDArray[Any]], n: int) -> Array:
        """The model matrix (n, p) of what `read` gives."""
        X = np.empty((n, len(self.columns)))
        for first in range(0, n, ROWS_AT_ONCE):
            rows = slice(first, first + ROWS_AT_ONCE)
            for block in self.blocks:
                block.fill(X[rows, block.start : block.stop], read, rows)
        return X

    def read(self, frame: pd.DataFrame | CodedRows) -> list[NDArray[Any]]:
        """For each piece the places (n,) of its levels or its numbers (n, width); the faults of all together."""
        reader = Reader(frame, self.where)
        read: list[NDArray[Any]] = []
        faults: list[Fault] = []
        for one in self.pieces:
            try:
                read.append(one.codes(reader) if isinstance(one, LevelPiece) else one.values(reader))
            except InputFault as found:
                faults.extend(found.faults)
        if faults:
            raise InputFault(list(dict.fromkeys(faults)))
        return read


def build_design(
    formula: VettedFormula,
    frame: pd.DataFrame,
    columns: Mapping[str, Column],
    exposures: Sequence[str],
    counts: Array | None = None,
) -> Design:
    """The design of a formula on training records in memory.

    frame: complete coded records. columns: what is known of each column. exposures: the columns that the question is
    about; every term that holds one has their role. counts (n,): true frequencies, for means, deviations and knots.
    InputFault with all faults of the formula against these records together.
    """
    frequencies = None if counts is None else np.asarray(counts, dtype=np.float64)
    return design_of(formula, FrameTraining(frame, formula.where, frequencies), columns, exposures)


def design_of(
    formula: VettedFormula, training: Training, columns: Mapping[str, Column], exposures: Sequence[str]
) -> Design:
    """The design of a formula on training records wherever they are; see `build_design`."""
    findings: list[Finding] = []
    pieces: list[Piece] = []
    faults: list[Fault] = []
    for factor in formula.factors:
        try:
            made, notes = _piece(factor, columns, training)
            pieces.append(made)
            findings.extend(notes)
        except InputFault as found:
            faults.extend(found.faults)
    if faults:
        raise InputFault(list(dict.fromkeys(faults)))
    findings.extend(_constants_held_twice(formula))

    _bounded(formula, pieces)
    planned = plan_terms(formula.terms, formula.intercept, pieces)
    blocks = _blocks([block for term in planned for block in term.blocks], pieces)
    if blocks[-1].stop > MOST_COLUMNS:
        raise formula_fault("design-too-many-columns", formula.where, None, most=MOST_COLUMNS)
    described = Describer(formula.factors, pieces, columns, exposures, training).describe(planned)
    return Design(*described, tuple(findings), tuple(pieces), blocks, formula.where)


def _piece(factor: Factor, columns: Mapping[str, Column], training: Training) -> tuple[Piece, tuple[Finding, ...]]:
    reader = training.reader
    numbers_only = not isinstance(factor, PlainColumn) and not (
        isinstance(factor, Levels) and isinstance(factor.source, PlainColumn)
    )
    for name in factor.columns:
        kind = columns[name].kind
        if kind in NOT_FOR_MODELS:
            raise InputFault(fault("design-not-for-models", reader.where, column=piece(name), kind=kind))
        if numbers_only and kind != "number":
            facts = {"column": piece(name), "kind": kind, "term": piece(factor.text)}
            raise InputFault(fault("design-not-a-number", reader.where, **facts))
    column = columns[factor.columns[0]]
    if isinstance(factor, Bands | Levels) or (isinstance(factor, PlainColumn) and column.kind != "number"):
        return level_piece(factor, column, training)
    return number_piece(factor, training), ()


def _constants_held_twice(formula: VettedFormula) -> list[Finding]:
    """Natural and cyclic splines span the constant unless they are centred."""
    alone = [formula.factors[term[0]] for term in formula.terms if len(term) == 1]
    return [
        finding("caution", "spline-holds-constant", term=factor.text)
        for factor in alone
        if formula.intercept and isinstance(factor, CubicSpline) and not factor.centred
    ]


def _bounded(formula: VettedFormula, pieces: Sequence[Piece]) -> None:
    """Refuse what could not have few enough columns, before anything is made of it."""
    least = 0
    for term in formula.terms:
        widths = [
            one.width if isinstance(one, NumberPiece) else len(one.levels) - 1 for one in (pieces[k] for k in term)
        ]
        least += int(np.prod(widths, dtype=object))
    if least > MOST_COLUMNS:
        raise formula_fault("design-too-many-columns", formula.where, None, most=MOST_COLUMNS)


def _blocks(planned: Sequence[PlannedBlock], pieces: Sequence[Piece]) -> tuple[Block, ...]:
    blocks: list[Block] = []
    start = 0
    for block in planned:
        widths = [
            pieces[place].width if matrix is None else matrix.shape[1]  # type: ignore[union-attr]
            for place, matrix in zip(block.factors, block.contrasts, strict=True)
        ]
        # The first factor's columns run fastest.
        products = [chosen[::-1] for chosen in itertools.product(*(range(width) for width in reversed(widths)))]
        choices = tuple(np.array([chosen[k] for chosen in products], dtype=np.intp) for k in range(len(widths)))
        blocks.append(Block(block.factors, block.contrasts, choices, start, start + len(products)))
        start += len(products)
    return tuple(blocks)
