"""Which way each contrast of the coefficients goes along the directions of a recession cone."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

import numpy as np
from scipy.linalg import orth

from oddsmodel.inference.cone_rows import Direction, ExactDirection, RoundedDirection, exact
from oddsmodel.inference.linear_program import extreme
from oddsmodel.inference.rational import Whole, product, signs, whole_row
from oddsmodel.inference.rational_program import combination
from oddsmodel.inference.recession_cone import MOST_ROUNDS, NO_GAIN, PROGRAM_SIZE, RecessionCone
from oddsmodel.inference.row_space import solved
from oddsmodel.inference.working_rows import Index, UnitRows
from oddsmodel.likelihood.base import Array

Kind = Literal["finite", "plus infinity", "minus infinity", "undetermined"]

GRAIN = 1 << 26

PROOFS = 2e7
"""Number of contrasts times the cube of the equations of each, up to which they are proved."""


@dataclass(frozen=True)
class ContrastSign:
    """Which way a contrast goes, and whether that was proved in whole numbers."""

    kind: Kind
    verified: bool


def contrast_signs(cone: RecessionCone, contrasts: Array) -> list[ContrastSign]:
    """The signs of c'v over the directions v of a cone, for the rows c of contrasts (k, p).

    Finite where c is in the span of the rows kept, so that c'v = 0 for all v. Otherwise c'v differs from zero on the
    relative interior of the cone. It has one sign where the linear program that makes c'v least (or largest) over the
    cone ends at zero, its dual weights writing c as a combination of separated rows and kept ones (Farkas 1902); else
    there are directions either way.
    """
    search = _Search(cone, np.atleast_2d(np.asarray(contrasts, dtype=np.float64)))
    return search.run()


class _Search:
    def __init__(self, cone: RecessionCone, contrasts: Array) -> None:
        self.cone, self.contrasts = cone, contrasts
        self.exactly = cone.inexact is None
        self.basis = cone.null_basis
        self.whole = [whole_row(c)[0] for c in contrasts]

    def run(self) -> list[ContrastSign]:
        found: dict[int, ContrastSign] = {}
        upward: dict[int, int] = {}
        for k in range(len(self.contrasts)):
            if not any(self._sign(k, one) for one in self.basis):
                found[k] = ContrastSign("finite", self.exactly)
                continue
            upward[k] = self._sign(k, self.cone.direction)
            if upward[k] == 0:
                found[k] = ContrastSign("undetermined", self.exactly)
            elif len(self.basis) == 1:
                found[k] = self._one_way(upward[k], self.exactly)
        self.proving = self.exactly and (len(upward) - len(found)) * len(self.basis) ** 3 <= PROOFS
        for _ in range(MOST_ROUNDS):
            pending = [k for k in range(len(self.contrasts)) if k not in found]
            if not pending:
                break
            candidates: dict[int, Direction] = {}
            working = self.cone.working
            apart = np.flatnonzero(self.cone.direction.signs(working.X) != 0)
            unit = UnitRows(working, self._space())
            for k in pending:
                other_way = self._other_way(k, upward[k], unit, apart)
                if isinstance(other_way, bool):
                    found[k] = self._one_way(upward[k], other_way)
                else:
                    candidates[k] = other_way
            if not candidates:
                break
            if not self.cone.against(list(candidates.values())):
                # no row is against any of them
                for k, candidate in candidates.items():
                    found[k] = ContrastSign("undetermined", isinstance(candidate, ExactDirection))
                break
        for k in range(len(self.contrasts)):
            found.setdefault(k, self._one_way(upward.get(k, 1), False))
        return [found[k] for k in range(len(self.contrasts))]

    @staticmethod
    def _one_way(upward: int, verified: bool) -> ContrastSign:
        return ContrastSign("plus infinity" if upward > 0 else "minus infinity", verified)

    def _sign(self, k: int, direction: Direction) -> int:
        """The sign of c'v."""
        if isinstance(direction, ExactDirection):
            value = product(self.whole[k], direction.whole)
            return (value > 0) - (value < 0)
        scale, v, c = self.cone.working.scale, direction.floats, self.contrasts[k]
        total = float(c @ v)
        nothing = 10.0 * NO_GAIN * float(np.abs(v * scale).max(initial=0.0)) * float(np.abs(c / scale).sum())
        return 0 if abs(total) <= nothing else int(np.sign(total))

    def _space(self) -> Array:
        """An orthonormal basis (p, d) of the directions that leave the kept rows at zero, in scaled columns."""
        basis = np.array([one.floats for one in self.basis]) * self.cone.working.scale
        return np.asarray(orth(basis.T / np.abs(basis).max(axis=1)))

    def _other_way(self, k: int, upward: int, unit: UnitRows, apart: Index) -> Direction | bool:
        """A direction in the cone of the working rows along which c'v has the other sign; where there is none,
        whether that was proved."""
        scale = self.cone.working.scale
        objective = -upward * (self.contrasts[k] / scale) @ unit.turn
        size = float(np.abs(objective).max())
        best = extreme(objective / (size or 1.0), unit.rows[apart], np.zeros((0, objective.size)))
        turned = best is not None and best.value > NO_GAIN
        if not self.exactly or not (self.proving or turned):
            if best is None or not turned:
                return False
            v = unit.direction(best.point)
            return RoundedDirection(v, NO_GAIN * float(scale @ np.abs(v)))
        if best is not None and turned:
            mixed = self._inside(k, upward, unit.direction(best.point), apart)
            if mixed is not None:
                return mixed
        elif best is not None and self._proved(k, upward, apart, best.weights):
            return True
        return self._decided(k, upward, apart)

    def _inside(self, k: int, upward: int, v: Array, apart: Index) -> Direction | None:
        """An exact direction near v on the side of the cone's interior, so that rounding does not leave the cone."""
        cone = self.cone
        interior = cone.direction.floats
        c = self.contrasts[k]
        there, here = float(c @ interior), float(c @ v)
        scale = float(np.abs(v).max()) / float(np.abs(interior).max())
        share = 0.5 * abs(here) / (abs(here) + abs(there) * scale)
        mixed = (1.0 - share) * v + share * scale * interior
        unit = [cone.working.power(j) for j in cone.kept.free]
        wanted = [float(mixed[j]) * float(one) for j, one in zip(cone.kept.free, unit, strict=True)]
        size = max(abs(one) for one in wanted)
        if not size > 0.0:
            return None
        entries = [Fraction(round(one / size * GRAIN), GRAIN) / by for one, by in zip(wanted, unit, strict=True)]
        found = cone.kept.orthogonal(entries)
        value = product(self.whole[k], found)
        on_their_side = (signs(cone.working.X[apart], found) * cone.working.sides[apart] >= 0).all()
        return exact(found) if value * upward < 0 and on_their_side else None

    def _along(self, row: Whole) -> Whole:
        """The inner products of a row with the basis of the space orthogonal to the kept rows."""
        return [product(row, one.whole) for one in self.basis if isinstance(one, ExactDirection)]

    def _proved(self, k: int, upward: int, apart: Index, weights: Array) -> bool:
        """Whether the rows of positive weight prove exactly that c'v has one sign."""
        used = apart[weights > NO_GAIN * weights.max(initial=0.0)].tolist()
        vectors = [self._along(self.cone.working.whole(row)[0]) for row in used]
        found = solved(vectors, [Fraction(upward * one) for one in self._along(self.whole[k])])
        return found is not None and all(one >= 0 for one in found)

    def _decided(self, k: int, upward: int, apart: Index) -> Direction | bool:
        """The same in exact arithmetic."""
        if apart.size * len(self.basis) > PROGRAM_SIZE:
            return False
        vectors = [self._along(self.cone.working.whole(row)[0]) for row in apart.tolist()]
        weights, found = combination(vectors, [upward * one for one in self._along(self.whole[k])])
        if found is None:
            return weights is not None
        total = [0] * self.cone.parameters
        for weight, one in zip(found, self.basis, strict=True):
            if isinstance(one, ExactDirection):
                total = [a + weight * b for a, b in zip(total, one.whole, strict=True)]
        return exact(total)
