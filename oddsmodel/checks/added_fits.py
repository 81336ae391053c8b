"""The model fitted with columns made from its fit beside its own: likelihood-ratio tests of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.added_columns import AddedColumns, Array, AtFit, FitTest, Maker, columns_of, withheld
from oddsmodel.checks.column_fits import column_fits
from oddsmodel.checks.nearby import Known
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import Leaf
from oddsmodel.wording import say


@dataclass(frozen=True, eq=False)
class _Beside:
    """Adds to X (n, p) what its columns leave over of others (n, k), each over its scale (k,)."""

    at: AtFit
    makers: tuple[Maker, ...]
    weights: Array
    scale: Array

    def __call__(self, rows: Leaf) -> Leaf:
        fitted = self.at.rows(rows)
        left = columns_of(self.makers, fitted) - self.at.working(fitted.X) @ self.weights
        return {**rows, "X": np.hstack([fitted.X, left / self.scale])}


def likelihood_ratio_tests(model: FittedModel, added: AddedColumns, names: Sequence[str]) -> dict[str, FitTest]:
    """Twice the gain of the log-likelihood by the columns under each name, where their score can be tested.

    The columns stay those of the fit without them.
    """
    tests: dict[str, FitTest] = {}
    chosen = {}
    for name in names:
        places, reason = added.usable(name)
        if reason or not added.enough(places.size):
            tests[name] = withheld(reason or added.too_few())
        else:
            chosen[name] = places
    if not chosen:
        return tests
    p = model.fit.coefficients.size
    makers = {name: added.makers[name] for name in chosen}
    every = np.concatenate([np.arange(added.score.size)[added.places[name]] for name in chosen])
    own = np.diag(added.information)[every]
    # a column that cannot be tested stands beside the others unused
    scale = np.where(own > 0.0, np.sqrt(np.maximum(own, 0.0)), 1.0)
    beside = _Beside(added.at, tuple(makers.values()), added.weights[:, every], scale)
    likelihood = BinomialLikelihood.over(model.rows.passes.mapped(beside), p + every.size)
    information = np.zeros((p + every.size,) * 2)
    information[:p, :p] = model.fit.information
    information[p:, p:] = added.information[np.ix_(every, every)] / np.outer(scale, scale)
    known = Known(
        np.concatenate([model.fit.coefficients, np.zeros(every.size)]),
        np.concatenate([np.zeros(p), added.score[every] / scale]),
        information,
    )
    position = {place: p + number for number, place in enumerate(every.tolist())}
    wanted = [[*range(p), *(position[place] for place in places.tolist())] for places in chosen.values()]
    for (name, places), fit in zip(chosen.items(), column_fits(likelihood, known, wanted), strict=True):
        if fit is None:
            tests[name] = withheld(say("goodness-no-fit"))
            continue
        statistic = max(0.0, 2.0 * (fit.log_likelihood - model.fit.log_likelihood))
        tests[name] = FitTest(statistic, places.size, chi_square_p(statistic, places.size))
    return tests
