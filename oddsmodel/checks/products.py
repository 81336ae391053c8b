"""Products of exposure and adjustment columns beside the columns of a matrix, and those of them that add anything."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.power_fits import constant_columns
from oddsmodel.inference.symmetric import solve
from oddsmodel.likelihood.binomial import Moved
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.passes import LEAF_ROWS, Leaf

ALIASED = 1e-9
"""A product of whose weighted square less than this part is its own, beside all columns before it, adds nothing."""


@dataclass(frozen=True, eq=False)
class Products:
    """Makes rows with the columns in working coordinates and, beside them, products of pairs of the columns themselves,
    each less a centre and by a scale (p,).

    With the columns and the constant in the matrix, centres and scales change no fit.
    """

    pairs: tuple[tuple[int, int], ...]
    centre: Array
    scale: Array
    moved: Moved | None

    def __call__(self, rows: Leaf) -> Leaf:
        X = rows["X"]
        n, p = X.shape
        wide = np.empty((n, p + len(self.pairs)))
        first, second = (np.array(side) for side in zip(*self.pairs, strict=True))
        for start in range(0, n, LEAF_ROWS):
            some = slice(start, start + LEAF_ROWS)
            wide[some, :p] = X[some] if self.moved is None else self.moved.of(X[some])
            away = (X[some] - self.centre) / self.scale
            np.multiply(away[:, first], away[:, second], out=wide[some, p:])
        return {**rows, "X": wide}


def product_pairs(model: FittedModel) -> tuple[tuple[int, int], ...]:
    """Positions of each exposure column with each adjustment column, interactions among either left out."""
    exposures, adjustment = set(model.exposures), set(model.adjustment)
    main = [
        (i, set(column.sources))
        for i, column in enumerate(model.design.columns)
        if column.kind not in ("intercept", "interaction")
    ]
    ours = [i for i, sources in main if sources <= exposures]
    others = [i for i, sources in main if sources <= adjustment]
    return tuple((i, j) for i in ours for j in others)


def products_of(model: FittedModel, pairs: tuple[tuple[int, int], ...]) -> Products:
    """The products, of columns about standardised over the records where the model holds the constant."""
    gram = model.likelihood.gram()
    centre, scale = np.zeros(gram.shape[0]), np.sqrt(np.diag(gram) / model.records)
    constant = list(constant_columns(model))
    if constant:
        centre = gram[constant].sum(axis=0) / model.records
        spread = np.diag(gram) / model.records - centre**2
        scale = np.where(spread > 0.0, np.sqrt(np.abs(spread)), scale)
    to_beta = model.fit.space.to_beta
    moved = None if to_beta is None else Moved(np.asarray(to_beta, dtype=np.longdouble))
    return Products(pairs, centre, scale, moved)


@dataclass(frozen=True, eq=False)
class Beside:
    """What the columns added after the first p bring of their own, from score and information (p + k, ...) at a maximum
    over the first p.

    kept: positions among the k of columns that are no combination of those before. statistic: the score test of them
    all (Rao 1948, Proc Cambridge Philos Soc 44:50-57).
    """

    kept: tuple[int, ...]
    statistic: float


def beside(score: Array, information: Array, p: int) -> Beside:
    across = information[:p, p:]
    through = solve(information[:p, :p], np.column_stack([across, score[:p]]))
    own = information[p:, p:] - across.T @ through[:, :-1]
    pull = score[p:] - across.T @ through[:, -1]
    kept: list[int] = []
    rows: list[Array] = []
    factor = np.zeros((0, own.shape[0]))
    for k in range(own.shape[0]):
        row = own[k] - factor[:, k] @ factor
        if row[k] > ALIASED * information[p + k, p + k]:
            rows.append(row / np.sqrt(row[k]))
            factor = np.array(rows)
            kept.append(k)
    square = np.ix_(kept, kept)
    statistic = float(pull[kept] @ solve(own[square], pull[kept])) if kept else 0.0
    return Beside(tuple(kept), max(0.0, statistic))
