"""Rows of a model matrix with the bends of its lines beside them, made anew in every pass."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from oddsmodel.checks.nearby import PART_FROM
from oddsmodel.model.fitted import Array
from oddsmodel.passes import LEAF_ROWS, Leaf, MemoryPasses, Passes


@dataclass(frozen=True, eq=False)
class Bends:
    """Adds to X (n, p) the columns of a restricted cubic spline, but for its straight one, of some of its columns.

    positions: of those columns. knots: of each spline (k,).
    """

    positions: tuple[int, ...]
    knots: tuple[Array, ...]

    def places(self, parameters: int) -> list[tuple[int, ...]]:
        """The positions of the columns added for each, after a matrix of so many columns."""
        ends = parameters + np.cumsum([knots.size - 2 for knots in self.knots])
        return [tuple(range(end - knots.size + 2, end)) for end, knots in zip(ends.tolist(), self.knots, strict=True)]

    def beside(self, passes: Passes) -> Passes:
        """The rows with their bends: where they are many made anew in every pass, which takes no memory."""
        if isinstance(passes, MemoryPasses) and passes.rows <= PART_FROM:
            return MemoryPasses(self(passes.arrays))
        return passes.mapped(self)

    def __call__(self, rows: Leaf) -> Leaf:
        X = rows["X"]
        n, p = X.shape
        places = self.places(p)
        wide = np.empty((n, places[-1][-1] + 1))
        for first in range(0, n, LEAF_ROWS):
            some, made = X[first : first + LEAF_ROWS], wide[first : first + LEAF_ROWS]
            made[:, :p] = some
            for position, knots, weights, place in zip(self.positions, self.knots, self._weights, places, strict=True):
                above = some[:, position] - knots[:, None]
                np.maximum(above, 0.0, out=above)
                cubes = above * above
                cubes *= above
                made[:, place[0] : place[-1] + 1] = (weights @ cubes).T
        return {**rows, "X": wide}

    @cached_property
    def _weights(self) -> list[Array]:
        """For each spline the weights (k - 2, k) of the cubes of what is above its knots."""
        return [_weights_of_cubes(knots) for knots in self.knots]


def _weights_of_cubes(knots: Array) -> Array:
    """Those of `restricted_cubic_basis` (Harrell 2001, equation 2.25)."""
    first, before, last = knots[0], knots[-2], knots[-1]
    inner = knots[:-2]
    ends = np.column_stack([inner - last, before - inner]) / (last - before)
    return np.asarray(np.hstack([np.eye(inner.size), ends]) / (last - first) ** 2)
