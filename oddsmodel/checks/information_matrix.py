"""The information-matrix test: do the records vary about the fit as the model says, column by column?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.added_columns import AddedColumns, Array, FittedRows, FitTest, score_test
from oddsmodel.model.fitted import FittedModel

NAME = "information_matrix"


@dataclass(frozen=True, eq=False)
class Indicators:
    """(1 − 2p)(x − c)² for each column x of the model (m, p). centres (p,): c."""

    centres: Array

    @classmethod
    def of(cls, model: FittedModel) -> Indicators:
        """Numbers are taken from their mean, weighted by p(1 − p), so that their origin does not matter; indicators of
        levels as they are, so that with the intercept's column the reference does not matter either."""
        columns, information = model.design.columns, model.fit.information
        centres = np.zeros(len(columns))
        intercept = next((i for i, column in enumerate(columns) if column.kind == "intercept"), None)
        if intercept is not None:
            for i, column in enumerate(columns):
                crossed = column.kind == "interaction" and column.levels is not None and all(column.levels.values())
                if column.kind not in ("intercept", "level") and not crossed:
                    centres[i] = information[intercept, i] / information[intercept, intercept]
        return cls(centres)

    def __call__(self, rows: FittedRows) -> Array:
        return np.asarray(rows.lean[:, None] * (rows.X - self.centres) ** 2)


def test(added: AddedColumns) -> FitTest:
    """White's test of the diagonal of the information matrix, in Orme's form.

    Where the model holds, the sums of x²(y − p)² and of x²p(1 − p) agree, whatever the column x (White 1982,
    Econometrica 50:1-25). For binary outcomes their difference is the score of the column (1 − 2p)x², whose variance is
    had exactly from p (Orme 1988, Journal of Econometrics 38:227-248, from memory): the form by an outer product of
    observed scores, n R², rejects true models far too often (Orme 1990, Journal of Econometrics 46:309-331; Chesher &
    Spady 1991, Econometrica 59:787-815). The diagonal alone is taken, as in the comparison of Kuss 2002 (Statistics in
    Medicine 21:3789-3801): degrees of freedom that grow as the square of the number of columns cost size and power.
    """
    return score_test(added, NAME)
