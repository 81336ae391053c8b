"""The link test: is the logit of the risk bent against the linear predictor?"""

from __future__ import annotations

from oddsmodel.checks.added_columns import AddedColumns, Array, FittedRows, FitTest, score_test

NAME = "link_test"


def column(rows: FittedRows) -> Array:
    """The squared linear predictor (m, 1)."""
    return rows.linear[:, None] ** 2


def test(added: AddedColumns) -> FitTest:
    """Score test of the squared linear predictor as a further column.

    Pregibon 1980, Applied Statistics 29:15-24: to the first order, a family of links that the logit is one of differs
    from it by a function of the linear predictor; the square serves where no family is named (Tukey 1949).
    """
    return score_test(added, NAME)
