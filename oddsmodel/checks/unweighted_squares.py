"""The unweighted sum of squares: are fitted probabilities too bold, or not bold enough?"""

from __future__ import annotations

from oddsmodel.checks.added_columns import AddedColumns, Array, FittedRows, FitTest, score_test

NAME = "unweighted_squares"


def column(rows: FittedRows) -> Array:
    """1 − 2p (m, 1)."""
    return rows.lean[:, None]


def test(added: AddedColumns) -> FitTest:
    """The sum over records of (y − p)² against its mean, the sum of p(1 − p).

    Copas 1989, Applied Statistics 38:71-80; for single records Hosmer, Hosmer, le Cessie & Lemeshow 1997, Statistics in
    Medicine 16:965-980. As y is 0 or 1, (y − p)² − p(1 − p) = (1 − 2p)(y − p): the difference is the score of the
    column 1 − 2p, and its variance what a weighted regression of that column on the model's leaves over.
    """
    return score_test(added, NAME)
