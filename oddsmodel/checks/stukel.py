"""Stukel's test: is either tail of the logistic curve too long or too short?"""

from __future__ import annotations

import numpy as np

from oddsmodel.checks.added_columns import AddedColumns, Array, FittedRows, FitTest, score_test

NAME = "stukel"


def columns(rows: FittedRows) -> Array:
    """eta²/2 where the linear predictor eta is at least 0, and −eta²/2 where it is below (m, 2)."""
    half = 0.5 * rows.linear**2
    above = rows.linear >= 0.0
    return np.column_stack([np.where(above, half, 0.0), np.where(above, 0.0, -half)])


def test(added: AddedColumns) -> FitTest:
    """Score test of the two columns by which a curve with other tails differs, to the first order, from the logistic.

    Stukel 1988, Journal of the American Statistical Association 83:426-431, section 3. A tail that only few records
    reach is left out, which leaves one degree of freedom.
    """
    return score_test(added, NAME)
