"""Condition indices: which coefficients the weighted columns leave poorly told apart."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.power_fits import constant_columns
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.study import CheckResult
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say

STRONG = 30.0
"""From this condition index on a dependency is strong (Belsley, Kuh & Welsch 1980, section 3.2)."""

HALF = 0.5
"""A dependency touches the coefficients of which it holds more than this share of the variance, if two or more."""

SHOWN = 4
LEAST = 1e-13


@dataclass(frozen=True, eq=False)
class Conditions:
    """indices (k,): largest first. proportions (k, q): of the variance of each coefficient that goes with each index.

    positions: of the q columns in the model matrix.
    """

    indices: Array
    proportions: Array
    positions: tuple[int, ...]

    @property
    def bound(self) -> tuple[int, ...]:
        """Positions of the columns that a strong dependency touches."""
        found: set[int] = set()
        for index, shares in zip(self.indices, self.proportions, strict=True):
            touched = [i for i, share in zip(self.positions, shares, strict=True) if share > HALF]
            if index >= STRONG and len(touched) > 1:
                found.update(touched)
        return tuple(sorted(found))


def check(model: FittedModel) -> CheckResult:
    """Condition indices and variance-decomposition proportions (Belsley, Kuh & Welsch 1980, Regression Diagnostics,
    sections 3.2 and 3.3) of the matrix weighted as at the maximum, its columns of length one, with the constant among
    them and with the constant projected off."""
    root = weighted_root(model)
    constant = constant_columns(model)
    everything = tuple(range(root.shape[1]))
    with_constant = conditions(root, everything)
    rest = tuple(i for i in everything if i not in constant[:1])
    off = None
    if constant and rest:
        ones = root[:, list(constant)].sum(axis=1)
        off = conditions(root[:, list(rest)] - np.outer(ones, ones @ root[:, list(rest)]) / (ones @ ones), rest)
    spoken = with_constant if off is None else off
    statistics: dict[str, float | int | None] = {
        "largest_index": None if with_constant is None else float(with_constant.indices[0]),
        "largest_index_without_constant": None if off is None else float(off.indices[0]),
    }
    told = {
        "largest_index": say("conditions-no-number"),
        "largest_index_without_constant": say(
            "conditions-no-number" if constant and rest else "conditions-no-constant"
        ),
    }
    bound = () if spoken is None else spoken.bound
    exposed = set(bound) & set(model.exposure_indices)
    tables = [
        _table(model, found, identity)
        for found, identity in ((with_constant, "condition_indices"), (off, "condition_indices_without_constant"))
        if found is not None
    ]
    return CheckResult(
        name="condition_indices",
        family="collinearity",
        title=say("conditions-title"),
        verdict="not applicable" if spoken is None else "look" if exposed else "fine",
        line="",
        statistics=statistics,
        reasons={name: told[name] for name, value in statistics.items() if value is None},
        tables=tuple(tables),
        explanation=say(
            "conditions-explanation",
            known=spoken is not None,
            bound=[model.design.columns[i].label for i in bound],
            exposed=bool(exposed),
        ),
    )


def weighted_root(model: FittedModel) -> Array:
    """A matrix (p, p) whose columns have the lengths and angles of the weighted columns of the model matrix."""
    space = model.fit.space
    root = np.asarray(np.linalg.cholesky(model.fit.working_information).T, dtype=np.float64)
    return root if space.from_beta is None else np.asarray(root @ space.from_beta)


def conditions(root: Array, positions: tuple[int, ...]) -> Conditions | None:
    """Of columns (m, q); None where one is all but a combination of the others.

    With X = U D V' of columns of length one, index k is d_max / d_k, and the share of the variance of coefficient j
    that goes with it (v_jk / d_k)² over the sum of these over k.
    """
    length = np.sqrt((root**2).sum(axis=0))
    if not (length > 0.0).all():
        return None
    _, singular, directions = np.linalg.svd(root / length, full_matrices=False)
    if singular[-1] < LEAST * singular[0]:
        return None
    parts = (directions / singular[:, None]) ** 2
    order = np.argsort(singular, kind="stable")
    return Conditions(singular[0] / singular[order], (parts / parts.sum(axis=0))[order], positions)


def _table(model: FittedModel, found: Conditions, identity: str) -> Table:
    shown = min(SHOWN, found.indices.size)
    columns = [TableColumn("coefficient", say("conditions-coefficient"))]
    for k, index in enumerate(found.indices[:shown].tolist()):
        columns.append(TableColumn(f"index_{k + 1}", say("conditions-index", index=index), "percent"))
    rows: list[tuple[Cell, ...]] = [
        (model.design.columns[i].label, *found.proportions[:shown, place].tolist())
        for place, i in enumerate(found.positions)
    ]
    title = say("conditions-table" if identity == "condition_indices" else "conditions-table-without-constant")
    return Table(identity, title, tuple(columns), tuple(rows), say("conditions-note"))
