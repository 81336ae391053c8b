"""Complete and quasi-complete separation: the verdict, its proof, and what it does to each coefficient."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.cone_rows import ExactDirection, moved
from oddsmodel.inference.contrast_signs import ContrastSign, Kind, contrast_signs
from oddsmodel.inference.recession_cone import Inexact, Overlap, RecessionCone, single_threaded
from oddsmodel.likelihood.base import Array, Likelihood
from oddsmodel.passes import MemoryPasses, Passes


@dataclass(frozen=True)
class Separation:
    """Whether some direction raises the log-likelihood without end, and what it does to each coefficient.

    separated: whether there is such a direction. complete: whether it separates every row. direction (p,): one
    that separates as many rows as any does (zeros where there is none). rows (n,): the rows it separates; all others
    are kept. coefficients: for each, whether its maximum-likelihood value is finite, plus or minus infinity, or of
    undetermined direction.

    The proof, in whole numbers: witness (p,) is `direction` exactly, side * x'witness being positive on the rows
    separated and zero on those kept (side: 1 for rows with events only, -1 for none); overlap gives multipliers that
    prove that no direction separates a row kept. verified: whether both were checked, and coefficients_verified the
    same for each coefficient. inexact says why not: "within rounding" where the verdict holds only if numbers that
    differ by no more than rounding are taken as equal, "too many columns" where whole numbers would have become too
    long, "too many steps" where the search was broken off.
    """

    separated: bool
    complete: bool
    direction: Array
    rows: NDArray[np.bool_]
    coefficients: tuple[Kind, ...]
    verified: bool
    inexact: Inexact | None
    witness: tuple[int, ...] | None
    overlap: Overlap | None
    coefficients_verified: tuple[bool, ...]
    cone: RecessionCone = field(repr=False, compare=False)

    def contrasts(self, contrasts: Array) -> list[ContrastSign]:
        """What separation does to the contrasts c'beta, the rows of `contrasts` (k, p)."""
        with single_threaded():
            return contrast_signs(self.cone, contrasts)


def separation(X: Array, events: Array, trials: Array) -> Separation:
    """Decide separation of rows X (n, p) with events out of trials (n,).

    The log-likelihood has no finite maximum if and only if a direction v has x'v >= 0 on every row with events
    only, x'v <= 0 on every row with none, x'v = 0 on mixed rows, and is not zero on all rows (Albert & Anderson
    1984, Biometrika 71:1-10; Santner & Duffy 1986, Biometrika 73:755-758). See `RecessionCone` for how such v are
    found. Where columns are combinations of others, their coefficients are undetermined.

    Raises ValueError where a number is not finite.
    """
    return separation_of_rows(MemoryPasses({"X": _finite(X), "events": events, "trials": trials}), X.shape[1])


def separation_of_differences(differences: Array) -> Separation:
    """Decide separation of a conditional likelihood from the differences (m, p) of a case's row less a control's.

    The conditional likelihood of matched sets has no finite maximum if and only if a direction v has d'v >= 0 for
    every difference d of a case and a control of one set and is not zero on all of them (Santner & Duffy 1986, for
    differences of rows in place of rows). The rows of the answer are the differences.

    Raises ValueError where a number is not finite.
    """
    return separation_of_rows(MemoryPasses({"X": _finite(differences)}), differences.shape[1])


def separation_of(likelihood: Likelihood) -> Separation:
    """Decide separation of the rows of a likelihood, in memory or not."""
    return separation_of_rows(passes_of(likelihood), likelihood.parameters)


def separation_of_rows(passes: Passes, parameters: int) -> Separation:
    """Decide separation of rows that a pass holds: X, events and, unless all are 1, trials; or differences X alone."""
    with single_threaded():
        cone = RecessionCone(passes, parameters)
        signs = contrast_signs(cone, np.eye(parameters))
    direction = cone.direction
    rows, complete = np.zeros(passes.rows, dtype=bool), False
    if cone.separated:
        parts = list(passes.each(moved, direction))
        rows, complete = np.concatenate([part for part, _ in parts]), all(whole for _, whole in parts)
    return Separation(
        separated=cone.separated,
        complete=complete,
        direction=direction.floats,
        rows=rows,
        coefficients=tuple(one.kind for one in signs),
        verified=cone.inexact is None,
        inexact=cone.inexact,
        witness=direction.whole if isinstance(direction, ExactDirection) else None,
        overlap=cone.overlap,
        coefficients_verified=tuple(one.verified for one in signs),
        cone=cone,
    )


def separating_direction(likelihood: Likelihood) -> Array | None:
    """A direction (p,) that separates rows of a likelihood within rounding, where there is one; nothing is proved."""
    with single_threaded():
        cone = RecessionCone(passes_of(likelihood), likelihood.parameters, exactly=False)
    return cone.direction.floats if cone.separated else None


def _finite(X: Array) -> Array:
    if not np.isfinite(X).all():
        raise ValueError("X must be finite")
    return X


def passes_of(likelihood: Likelihood) -> Passes:
    """The passes over a likelihood's rows."""
    held: Passes | None = getattr(likelihood, "passes", None)
    if held is not None:
        return held
    X, events, trials = likelihood.rows_apart()
    return MemoryPasses({"X": X, "events": events, "trials": trials})
