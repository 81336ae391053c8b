"""How much of a number exposure's variance the adjustment columns explain."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.model.rows import COLUMN, Encode
from oddsmodel.passes import Leaf


def variation_explained(model: FittedModel, exposure: str) -> float | None:
    """Share of a number exposure's variance that the adjustment columns explain by least squares.

    None where the exposure does not vary.
    """
    columns = model.design.columns
    own = next((i for i, c in enumerate(columns) if c.kind == "number" and c.sources == (exposure,)), None)
    others = [i for i, c in enumerate(columns) if c.kind != "intercept" and exposure not in c.sources]
    passes = model.rows.passes
    if own is None:
        # Records with equal rows of the matrix may differ in a number that enters in bands, say.
        passes = passes if model.rows.single else model.rows.people.mapped(Encode(model.design, model.rows.levels))
    beside = passes.mapped(Last(tuple(others), own, exposure))
    moments = MomentsKernel()
    records, sums, _ = beside.reduce([moments], np.zeros(len(others) + 1))[0]
    products = beside.reduce([moments], sums / records)[0][2]
    length = np.sqrt(np.diag(products))
    if not length[-1] > 0.0:
        return None
    varies = np.flatnonzero(length > 0.0)
    correlations = products[np.ix_(varies, varies)] / np.outer(length[varies], length[varies])
    gram, cross = correlations[:-1, :-1], correlations[:-1, -1]
    return min(1.0, float(cross @ np.linalg.pinv(gram, rcond=1e-12, hermitian=True) @ cross))


@dataclass(frozen=True)
class Last:
    """Makes of rows: X of some of its columns and a number exposure last, from the column that it is of X or else from
    the record column."""

    others: tuple[int, ...]
    own: int | None
    exposure: str

    def __call__(self, rows: Leaf) -> Leaf:
        X = rows["X"]
        made = np.empty((X.shape[0], len(self.others) + 1))
        made[:, :-1] = X.take(self.others, axis=1)
        made[:, -1] = rows[COLUMN + self.exposure] if self.own is None else X[:, self.own]
        return {"X": made, **({"trials": rows["trials"]} if "trials" in rows else {})}


class MomentsKernel:
    """Records, and sums (p,) and products (p, p) over them of X less a centre (p,)."""

    def leaf(self, rows: Leaf, centre: Array) -> tuple[Array, Array, Array]:
        X = rows["X"] - centre
        weighted = X * rows["trials"][:, None] if "trials" in rows else X
        records = rows["trials"].sum() if "trials" in rows else float(X.shape[0])
        return np.asarray(records), weighted.sum(axis=0), weighted.T @ X
