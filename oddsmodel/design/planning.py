"""patsy plans: the order of terms, and for each term which codings keep it from spanning what stands before it.

It sees factors called f0, f1, ... with numbers of columns and of levels; never a formula, a name or a value of anybody.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from oddsmodel.design.levels import LevelPiece
from oddsmodel.design.numbers import NumberPiece
from oddsmodel.design.reading import Array

Piece = NumberPiece | LevelPiece


@dataclass(frozen=True)
class PlannedBlock:
    """Columns that are products of a column of each factor; of a factor with levels, of its contrast matrix.

    factors: their places. contrasts: for each, its matrix (levels, columns), or None for a number.
    """

    factors: tuple[int, ...]
    contrasts: tuple[Array | None, ...]


@dataclass(frozen=True)
class PlannedTerm:
    """A term as the places of its factors, and the blocks that stand for it, in order."""

    factors: tuple[int, ...]
    blocks: tuple[PlannedBlock, ...]


def plan_terms(terms: Sequence[tuple[int, ...]], intercept: bool, pieces: Sequence[Piece]) -> tuple[PlannedTerm, ...]:
    """The terms in the order of the model matrix. Terms are tuples of places among the pieces.

    Terms of levels alone come first, then those of each set of numbers, each by the number of factors; a factor with
    levels is coded in full where nothing before it spans its constant (Chambers & Hastie 1992, chapter 2).
    """
    from patsy import EvalEnvironment, LookupFactor, Poly, Sum, Treatment, design_matrix_builders
    from patsy import Term as PatsyTerm

    data: dict[str, object] = {}
    factors = []
    for place, piece in enumerate(pieces):
        name = f"f{place}"
        if isinstance(piece, NumberPiece):
            data[name] = np.zeros((1, piece.width))
            factors.append(LookupFactor(name))
            continue
        numbers = tuple(str(number) for number in range(len(piece.levels)))
        coding = {"treatment": Treatment(piece.reference), "sum": Sum(), "polynomial": Poly(list(piece.scores))}
        data[name] = [numbers[0]]
        factors.append(LookupFactor(name, force_categorical=True, contrast=coding[piece.coding], levels=numbers))
    place_of = {factor: place for place, factor in enumerate(factors)}
    wanted = [PatsyTerm([])] if intercept else []
    wanted += [PatsyTerm([factors[place] for place in term]) for term in terms]
    planned = design_matrix_builders([wanted], lambda: iter([data]), EvalEnvironment([]))[0]
    return tuple(
        PlannedTerm(
            tuple(place_of[factor] for factor in term.factors),
            tuple(
                PlannedBlock(
                    tuple(place_of[factor] for factor in block.factors),
                    tuple(_matrix(block.contrast_matrices.get(factor)) for factor in block.factors),
                )
                for block in blocks
            ),
        )
        for term, blocks in planned.term_codings.items()
    )


def _matrix(contrast: object) -> Array | None:
    return None if contrast is None else np.array(contrast.matrix, dtype=np.float64)  # type: ignore[attr-defined]
