"""A model with each of many subsets of its adjustment columns: the exposure's coefficients under all of them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.nearby import Known, maxima_near
from oddsmodel.design.constant import indicators_of_all_levels
from oddsmodel.inference.maximise import Problem, maximise_all
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.randomness import generator

WHOLE = 10
"""Up to so many columns all their subsets are fitted."""

SAMPLED = 1000
AT_ONCE = 128


def subsets_of(model: FittedModel) -> NDArray[np.bool_]:
    """All subsets (2^m, m) of m adjustment columns, or 1000 different ones drawn with equal chance, all and none first.

    Drawn by the plan's seed and the model's name alone.
    """
    m = len(model.adjustment)
    if m <= WHOLE:
        numbers = np.arange(2**m, dtype=np.int64)[::-1]
        found: NDArray[np.bool_] = (numbers[:, None] >> np.arange(m)) & 1 == 1
        return found[[0, -1, *range(1, len(found) - 1)]] if m else found
    drawn = generator(model.seed, "specification stability", model.name)
    every = np.concatenate([np.ones((1, m), dtype=bool), np.zeros((1, m), dtype=bool), drawn.random((4000, m)) < 0.5])
    _, first = np.unique(every, axis=0, return_index=True)
    return every[np.sort(first)][:SAMPLED]


def fit_subsets(model: FittedModel, kept: NDArray[np.bool_]) -> list[Array | None]:
    """The coefficients (p,) of each model with some of the adjustment columns kept (s, m), 0 for what is left out.

    All are sought side by side from the model itself; None where the search does not settle.
    """
    spaces = [_space(model, _left_in(model, row)) for row in kept]
    found: list[Array | None] = []
    for first in range(0, len(spaces), AT_ONCE):
        found += _fitted(model, spaces[first : first + AT_ONCE])
    return found


def _left_in(model: FittedModel, row: NDArray[np.bool_]) -> list[int]:
    """Positions of the columns of the matrix that are made of no record column left out."""
    out = {name for name, stays in zip(model.adjustment, row, strict=True) if not stays}
    return [i for i, column in enumerate(model.design.columns) if not out & set(column.sources)]


def _space(model: FittedModel, columns: Sequence[int]) -> Array:
    """The space (p, r) of some columns, and of the constant where it was the sum of indicators that are left out."""
    basis = np.eye(len(model.design.columns))[:, list(columns)]
    ones = list(indicators_of_all_levels(model.design))
    if not ones or set(ones) <= set(columns):
        return basis
    total = np.zeros((basis.shape[0], 1))
    total[ones] = 1.0
    return np.hstack([basis, total])


def _fitted(model: FittedModel, spaces: Sequence[Array]) -> list[Array | None]:
    fit = model.fit
    known = Known(fit.working, np.zeros_like(fit.working), fit.working_information)
    near = maxima_near(fit.space.working, known, [fit.space.gamma(space.T).T for space in spaces])
    far = [Problem(space) for space, one in zip(spaces, near, strict=True) if one is None]
    rest = iter(maximise_all(model.likelihood, far, near=fit) if far else ())
    found: list[Array | None] = []
    for one in near:
        if one is not None:
            found.append(fit.space.beta(one.point))
            continue
        other = next(rest)
        found.append(other.coefficients if other.status == "converged" else None)
    return found
