"""Number pieces of a model matrix: what a factor gives as one or more columns of numbers."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np

from oddsmodel.design.arithmetic import ColumnValue, Expression
from oddsmodel.design.b_spline import basis_spline
from oddsmodel.design.cubic_spline import cubic_spline
from oddsmodel.design.evaluate import evaluate, remembered
from oddsmodel.design.factors import BasisSpline, Computed, CubicSpline, PlainColumn, RestrictedCubicSpline
from oddsmodel.design.faults import piece
from oddsmodel.design.reading import Array, Reader
from oddsmodel.design.splines import HARRELL_QUANTILES, harrell_knots, restricted_cubic_basis
from oddsmodel.design.training import Training
from oddsmodel.errors import InputFault
from oddsmodel.plan.faults import fault

NumberFactor = PlainColumn | Computed | BasisSpline | CubicSpline | RestrictedCubicSpline


class Basis(Protocol):
    """Columns (n, width) made of numbers x (n,)."""

    @property
    def width(self) -> int: ...

    def __call__(self, x: Array) -> Array: ...


@dataclass(frozen=True)
class RestrictedCubicBasis:
    """knots (k,): rising; width k − 1."""

    knots: Array

    @property
    def width(self) -> int:
        return int(self.knots.size) - 1

    def __call__(self, x: Array) -> Array:
        return restricted_cubic_basis(x, self.knots)


@dataclass(frozen=True)
class NumberPiece:
    """An expression, and the basis that makes columns of it; None for the number itself."""

    expression: Expression
    basis: Basis | None = None

    @property
    def width(self) -> int:
        return 1 if self.basis is None else self.basis.width

    def values(self, reader: Reader) -> Array:
        """Its columns (n, width) for the records read."""
        x = evaluate(self.expression, reader)
        return x[:, np.newaxis] if self.basis is None else self.basis(x)


def number_piece(factor: NumberFactor, training: Training) -> NumberPiece:
    """The piece of a factor, with what the training records say kept in it: means, deviations, knots.

    InputFault where these records do not allow it.
    """
    if isinstance(factor, PlainColumn):
        training.check(ColumnValue(factor.column))
        return NumberPiece(ColumnValue(factor.column))
    expression = remembered(factor.expression, training)
    if isinstance(factor, Computed):
        training.check(expression)
        return NumberPiece(expression)
    reader = training.reader
    different, counts = training.values(expression)
    if different.size == 1:
        raise _fault("design-no-range", factor, reader)
    basis = _basis(factor, different, reader, counts)
    constant = isinstance(factor, CubicSpline) and not factor.centred
    if different.size < basis.width + (not constant):
        raise _fault("design-few-values", factor, reader, values=int(different.size), columns=basis.width)
    return NumberPiece(expression, basis)


def _basis(factor: BasisSpline | CubicSpline | RestrictedCubicSpline, x: Array, reader: Reader, counts: Array) -> Basis:
    if isinstance(factor, RestrictedCubicSpline):
        return _restricted_cubic(factor, x, reader, counts)
    lowest, highest = float(x.min()), float(x.max())
    if factor.knots is not None and not lowest < factor.knots[0] <= factor.knots[-1] < highest:
        raise _fault("design-knots-outside", factor, reader, lowest=f"{lowest:.6g}", highest=f"{highest:.6g}")
    made = basis_spline(factor, x, counts) if isinstance(factor, BasisSpline) else cubic_spline(factor, x, counts)
    if made is None:
        raise _fault("design-knots-tied", factor, reader)
    return made


def _restricted_cubic(factor: RestrictedCubicSpline, x: Array, reader: Reader, counts: Array) -> RestrictedCubicBasis:
    if not isinstance(factor.knots, int):
        return RestrictedCubicBasis(np.array(factor.knots))
    knots = harrell_knots(x, factor.knots, counts)
    if np.unique(knots).size < factor.knots:
        fewer = [number for number in HARRELL_QUANTILES if number < factor.knots]
        fits = [number for number in fewer if np.unique(harrell_knots(x, number, counts)).size == number]
        raise _fault("design-knots-tied", factor, reader, possible=max(fits, default=0))
    return RestrictedCubicBasis(knots)


def _fault(code: str, factor: NumberFactor, reader: Reader, **facts: object) -> InputFault:
    return InputFault(fault(code, reader.where, term=piece(factor.text), **facts))
