"""The directions in which a log-likelihood never falls, found by linear programs on few rows and passes over all."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.cone_rows import (
    Chosen,
    Direction,
    ExactDirection,
    RoundedDirection,
    against,
    exact,
    joined,
    outside,
    some_of_each,
)
from oddsmodel.inference.linear_program import extreme
from oddsmodel.inference.rational import Whole, common_whole, coprime, rounded, signs
from oddsmodel.inference.rational_program import combination
from oddsmodel.inference.row_space import RowSpace, solved
from oddsmodel.inference.working_rows import UnitRows, WorkingRows, independent, null_space
from oddsmodel.likelihood.base import Array
from oddsmodel.passes import TASK_ROWS, Passes
from oddsmodel.passes.work import products

Index = NDArray[np.intp]
Inexact = Literal["within rounding", "too many columns", "too many steps"]

NO_GAIN = 1e-8
"""Size of x'v, for a row and a direction of largest entry one, that a linear program may leave of nothing."""

NEARLY = 1e-13
"""Size of x'v that the rounding of a row's entries may leave of nothing."""

CLEARLY = (1e-7, 1e-10, 1e-13)
"""Sizes of x'v taken in turn as the least that is not zero, until the exact direction bears them out."""

GRAINS = (1, 60, 1 << 12, 1 << 26, 1 << 52)
"""Denominators tried in turn for the free entries of an exact direction: the plainest one that serves."""

EXACT_COLUMNS = 200
"""With more columns than this, whole numbers grow too long to be checked in seconds."""

PROGRAM_SIZE = 40_000
"""Entries of the rows up to which a program is solved in exact arithmetic where floating point fails."""

MOST_ROUNDS = 500
SAMPLE = 400
ADDED = 100


@dataclass(frozen=True)
class Overlap:
    """Rows that no direction separates: positive multipliers of those with a side whose weighted sum is zero.

    numbers (m,) of the rows in their source, multipliers (m,): whole numbers, those of rows with both outcomes of
    either sign. The sum of multiplier * side * x, with side 1 for rows with both, is exactly zero.
    """

    numbers: tuple[int, ...]
    multipliers: tuple[int, ...]


@contextmanager
def single_threaded() -> Iterator[None]:
    """Small matrix products on one thread, without words about numbers at the end of the range: these are settled in
    whole numbers."""
    with products().limit(limits=1, user_api="blas"), np.errstate(over="ignore", invalid="ignore"):
        yield


class RecessionCone:
    """The cone of the v with side * x'v >= 0 on every row of one outcome and x'v = 0 on every row of both.

    Rows it leaves at zero are kept, all others are separated by `direction`, which lies in its relative interior.
    The programs are solved on few working rows; every pass adds some that contradict the direction found, until none
    does (constraint generation: Dantzig, Fulkerson & Johnson 1954).

    1. On the working rows not yet separated, maximise the sum of side * x'v over the cone (Konis 2007).
    2. Where nothing is gained, the dual weights prove that those rows overlap (Stiemke 1915). All rows in their span
       are kept then; one outside it joins the working rows.
    3. Where something is gained, v is made exact, being orthogonal to the rows it leaves at zero. Rows against it join
       the working rows; where there are none, it is added to `direction`.

    `inexact` is None where every step was proved in whole numbers. Otherwise the cone is that of the rows within
    rounding: such rows x as count as zero along v have |x'v| of some 1e-8 of what its terms could add up to.
    """

    def __init__(
        self, passes: Passes, parameters: int, *, conditions: Array | None = None, exactly: bool = True
    ) -> None:
        """conditions (k, p): rows that directions must leave at zero. exactly: whether to prove anything."""
        self.passes, self.parameters = passes, parameters
        self.inexact: Inexact | None = None
        if parameters > EXACT_COLUMNS:
            self.inexact = "too many columns"
        elif not exactly:
            self.inexact = "within rounding"
        tasks = max(1, -(-passes.rows // TASK_ROWS))
        self._most = max(2, (ADDED + 4 * parameters) // tasks)
        self.working = WorkingRows(parameters)
        if conditions is not None:
            number = len(conditions)
            self.working.add(Chosen(conditions, np.zeros(number, dtype=np.int8), np.full(number, -1)))
        self.working.add(joined(list(passes.each(some_of_each, max(2, SAMPLE // (2 * tasks))))))
        self.direction: Direction = self._nowhere()
        self.kept = RowSpace(parameters)
        self.overlap: Overlap | None = None
        self._basis: list[Direction] = []
        self._find()

    @property
    def separated(self) -> bool:
        """Whether the direction separates any row."""
        return bool(self.direction.floats.any())

    @property
    def null_basis(self) -> Sequence[Direction]:
        """A basis of the space of all directions that leave the kept rows at zero."""
        return self._basis

    def remaining(self) -> Index:
        """The working rows that the direction leaves at zero."""
        return np.flatnonzero(self.direction.signs(self.working.X) == 0)

    def add(self, chosen: Iterable[Chosen]) -> bool:
        """Add rows to the working ones; whether there were new ones."""
        return self.working.add(joined(list(chosen)))

    def against(self, directions: Sequence[Direction]) -> bool:
        """Look in one pass for rows against some directions; whether there were any."""
        return self.add(self.passes.each(against, (directions, self._most)))

    def _nowhere(self) -> Direction:
        if self.inexact is None:
            return exact([0] * self.parameters)
        return RoundedDirection(np.zeros(self.parameters), 0.0)

    def _find(self) -> None:
        for _ in range(MOST_ROUNDS):
            found = self._step()
            if found is None:
                others = self._null_basis()
                if not others or not self.add(self.passes.each(outside, (self.direction, others, self._most))):
                    self._basis = others
                    return
            elif not self.against([found]):
                self.direction = self._sum(self.direction, found)
        self.inexact = "too many steps"
        self._basis = self._null_basis()

    def _step(self) -> Direction | None:
        """A direction in the cone of the working rows that separates more of them, or None where they overlap."""
        remaining = self.remaining()
        sides = self.working.sides
        unit = UnitRows(self.working)
        counted = remaining[sides[remaining] != 0]
        if counted.size == 0:
            self._accepted(dict.fromkeys(remaining.tolist(), Fraction(0)))
            return None
        equal = np.flatnonzero(sides == 0)
        equal = equal[independent(unit.rows[equal])]
        best = extreme(unit.rows[counted].sum(axis=0) / counted.size, unit.rows[sides != 0], unit.rows[equal])
        gains = np.zeros(sides.size) if best is None else unit.rows @ best.point
        gained = bool((gains[counted] > NO_GAIN).any())
        if self.inexact is not None:
            if best is None or not gained:
                return None
            v = unit.direction(best.point)
            return RoundedDirection(v, NO_GAIN * float(self.working.scale @ np.abs(v)))
        if best is not None and gained:
            for point in (self._clearest(unit.rows, counted, equal), best.point):
                found = None if point is None else self._realised(point, unit, counted)
                if found is not None:
                    return found
        elif best is not None:
            weights = np.zeros(sides.size)
            weights[sides != 0] = best.weights
            weights[counted] += 1.0 / counted.size
            weights[equal] = best.equal_weights
            if self._proved(remaining, weights / unit.length, unit.rows):
                return None
        return self._decided(remaining, counted, best is not None and gained and self._nearly(gains))

    def _nearly(self, gains: Array) -> bool:
        """Whether a direction contradicts no working row by more than the rounding of its entries."""
        sides = self.working.sides
        return bool((gains[sides != 0] >= -NEARLY).all() and (np.abs(gains[sides == 0]) <= NEARLY).all())

    def _clearest(self, rows: Array, counted: Index, equal: Index) -> Array | None:
        """The point that separates every remaining row with a side by as much as can be, where there is one: it needs
        no equations to be made exact."""
        sides = self.working.sides
        lifted = np.column_stack([rows, np.zeros(sides.size)])
        lifted[counted, -1] = -1.0
        objective = np.zeros(rows.shape[1] + 1)
        objective[-1] = 1.0
        best = extreme(objective, lifted[sides != 0], lifted[equal])
        return best.point[:-1] if best is not None and best.value > CLEARLY[0] else None

    def _realised(self, point: Array, unit: UnitRows, counted: Index) -> ExactDirection | None:
        """The exact direction near that of a point, orthogonal to the working rows it leaves at zero, where there is
        one."""
        sides, v, gains = self.working.sides, unit.direction(point), unit.rows @ point
        for least in CLEARLY:
            active = np.flatnonzero((gains <= least) | (sides == 0))
            clear = np.flatnonzero((gains > least) & (sides != 0))
            if not (gains[counted] > least).any():
                continue
            chosen = active[independent(unit.rows[active])].tolist()
            space = RowSpace(self.parameters, (self.working.whole(k)[0] for k in chosen))
            while space.free:
                found = self._near(space, v, clear)
                if found is None:
                    break
                wrong = self._wrong(found, active)
                if wrong is None:
                    return exact(found)
                if not space.add(self.working.whole(wrong)[0]):
                    break
        return None

    def _near(self, space: RowSpace, v: Array, clear: Index) -> Whole | None:
        """The direction orthogonal to a space, near v in its free entries, that has the clear rows on their side."""
        free = space.free
        scale = [self.working.power(j) for j in free]
        wanted = np.array([float(v[j]) * float(one) for j, one in zip(free, scale, strict=True)])
        size = float(np.abs(wanted).max())
        if not (size > 0.0 and np.isfinite(size)):
            return None
        for grain in GRAINS:
            entries = [Fraction(round(one / size * grain), grain) for one in wanted.tolist()]
            found = space.orthogonal([one / unit for one, unit in zip(entries, scale, strict=True)])
            if (signs(self.working.X[clear], found) == self.working.sides[clear]).all():
                return found
        return None

    def _wrong(self, direction: Whole, among: Index) -> int | None:
        """A working row that contradicts a direction."""
        sides = self.working.sides[among]
        found = signs(self.working.X[among], direction)
        wrong = np.flatnonzero((found * sides < 0) | ((sides == 0) & (found != 0)))
        return int(among[wrong[0]]) if wrong.size else None

    def _proved(self, remaining: Index, weights: Array, unit: Array) -> bool:
        """Whether weights (m,) near those given, positive on rows with a side, prove exactly that the remaining rows
        overlap."""
        rows = {k: self.working.whole(k)[0] for k in remaining.tolist()}
        given = {k: Fraction(float(weights[k])) / self.working.whole(k)[1] for k in rows}
        basis = remaining[independent(unit[remaining])].tolist()
        for bits in (12, 53):
            tried = {k: rounded(one, bits) for k, one in given.items()}
            unity, *whole = common_whole([Fraction(1), *tried.values()])
            total = [0] * self.parameters
            for row, weight in zip(rows.values(), whole, strict=True):
                if weight:
                    total = [known + weight * x for known, x in zip(total, row, strict=True)]
            added = solved([rows[k] for k in basis], [Fraction(-one, unity) for one in total])
            if added is None:
                return False
            for k, one in zip(basis, added, strict=True):
                tried[k] += one
            if self._accepted(tried):
                return True
        return False

    def _accepted(self, multipliers: dict[int, Fraction]) -> bool:
        """Keep multipliers of the remaining working rows in whole numbers as the proof that they overlap, where every
        row with a side has a positive one."""
        if any(one <= 0 for k, one in multipliers.items() if self.working.sides[k]):
            return False
        numbers = [int(self.working.numbers[k]) for k in multipliers]
        of_rows = coprime(one * self.working.whole(k)[1] for k, one in multipliers.items())
        self.overlap = Overlap(tuple(numbers), tuple(of_rows))
        return True

    def _decided(self, remaining: Index, counted: Index, nearly: bool) -> Direction | None:
        """Decide a step in exact arithmetic; where that is too long, or only rounding decides, go on inexactly.

        nearly: whether floating point holds that some direction separates rows.
        """
        sides = self.working.sides
        signed = [(k, 1) for k in range(sides.size)] + [(int(k), -1) for k in np.flatnonzero(sides == 0)]
        if len(signed) * self.parameters > PROGRAM_SIZE:
            return self._inexactly("too many columns")
        rows = [[sign * one for one in self.working.whole(k)[0]] for k, sign in signed]
        target = [-sum(self.working.whole(int(k))[0][j] for k in counted) for j in range(self.parameters)]
        weights, found = combination(rows, target)
        if found is not None:
            return exact(found)
        if weights is None:
            return self._inexactly("too many columns")
        if nearly:
            return self._inexactly("within rounding")
        total = dict.fromkeys(remaining.tolist(), Fraction(0))
        for (k, sign), one in zip(signed, weights, strict=True):
            if one:
                total[k] += sign * one
        for k in counted.tolist():
            total[k] += 1
        self._accepted(total)
        return None

    def _inexactly(self, reason: Inexact) -> Direction | None:
        self.inexact = reason
        self.direction = self._rounded(self.direction)
        return self._step()

    def _rounded(self, direction: Direction) -> Direction:
        """A direction whose signs are those of double precision."""
        if isinstance(direction, RoundedDirection):
            return direction
        return RoundedDirection(direction.floats, NO_GAIN * float(self.working.scale @ np.abs(direction.floats)))

    def _null_basis(self) -> list[Direction]:
        """A basis of the directions orthogonal to all remaining working rows."""
        if self.inexact is not None:
            self.direction = self._rounded(self.direction)
        remaining = self.remaining()
        unit = UnitRows(self.working)
        if self.inexact is not None:
            self.overlap = None
            zero = NO_GAIN * float(np.sqrt(self.parameters))
            return [RoundedDirection(unit.direction(v), zero) for v in null_space(unit.rows[remaining]).T]
        chosen = remaining[independent(unit.rows[remaining])].tolist()
        self.kept = RowSpace(self.parameters, (self.working.whole(k)[0] for k in chosen))
        while True:
            basis = self.kept.null_basis()
            left = [np.flatnonzero(signs(self.working.X[remaining], one)) for one in basis]
            more = {int(remaining[one[0]]) for one in left if one.size}
            if not more:
                return [exact(one) for one in basis]
            if not sum(self.kept.add(self.working.whole(k)[0]) for k in sorted(more)):
                # every prime of the elimination was unlucky
                self.inexact = "within rounding"
                return self._null_basis()

    def _sum(self, one: Direction, other: Direction) -> Direction:
        """A direction that separates what either does."""
        if isinstance(one, ExactDirection) and isinstance(other, ExactDirection):
            if not any(one.whole):
                return other
            sizes = [max(abs(x) for x in each.whole).bit_length() for each in (one, other)]
            shift = sizes[0] - sizes[1] if abs(sizes[0] - sizes[1]) > 10 else 0
            left, right = max(-shift, 0), max(shift, 0)
            total = [(x << left) + (y << right) for x, y in zip(one.whole, other.whole, strict=True)]
            return exact(total)
        v = one.floats + other.floats
        return RoundedDirection(v, NO_GAIN * float(self.working.scale @ np.abs(other.floats)))
