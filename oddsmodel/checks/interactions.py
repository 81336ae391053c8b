"""Interactions: one joint test of all products of exposure and adjustment columns."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.column_fits import column_fits, known_at
from oddsmodel.checks.number_lines import rarer_outcome
from oddsmodel.checks.products import beside, product_pairs, products_of
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import say

EVENTS_EACH = 10
"""Events, and records without one, for each column added (Peduzzi et al. 1996, J Clin Epidemiol 49:1373-1379)."""

MOST_FITTED = 60
"""With more columns added the score test stands in, which needs no second fit."""

MOST_PRODUCTS = 2000


@dataclass(frozen=True, slots=True)
class Joint:
    """The joint test. products: all of them; aliased: those that add nothing to the columns before them."""

    products: int
    aliased: int
    statistic: float
    p: float
    score: bool

    @property
    def df(self) -> int:
        return self.products - self.aliased


def check(model: FittedModel) -> CheckResult:
    """All exposure-by-adjustment products at once, by likelihood ratio, or by Rao's score test where they are many.

    Which product it is stays untold: of several looked at after the event the largest is chosen by chance.
    """
    joint, reason = _joint(model)
    statistics: dict[str, float | int | None] = dict.fromkeys(("products", "aliased", "statistic", "df", "p"))
    if joint is not None:
        statistics = {
            "products": joint.products,
            "aliased": joint.aliased,
            "statistic": joint.statistic,
            "df": joint.df,
            "p": joint.p,
        }
    return CheckResult(
        name="interactions",
        family="functional form",
        title=say("interactions-title"),
        verdict="not applicable" if joint is None else "look" if joint.p < 0.05 else "fine",
        line="",
        statistics=statistics,
        reasons=dict.fromkeys(statistics, reason) if joint is None else {},
        tables=() if joint is None else (_table(joint),),
        explanation=say(
            "interactions-explanation",
            p=joint.p if joint else None,
            aliased=joint.aliased if joint else 0,
            score=joint.score if joint else False,
        ),
    )


def _joint(model: FittedModel) -> tuple[Joint | None, str]:
    """The test, or why there is none."""
    if model.grouping is not None:
        return None, say("no-check-of-grouped-records")
    pairs = product_pairs(model)
    if not pairs:
        return None, say("interactions-no-products")
    if len(pairs) > MOST_PRODUCTS:
        return None, say("interactions-too-many", most=MOST_PRODUCTS)
    p = len(model.design.columns)
    wide = BinomialLikelihood.over(model.rows.passes.mapped(products_of(model, pairs)), p + len(pairs))
    known = known_at(wide, np.concatenate([model.fit.working, np.zeros(len(pairs))]))
    added = beside(known.score, known.information, p)
    aliased = len(pairs) - len(added.kept)
    if not added.kept:
        return None, say("interactions-all-aliased")
    if rarer_outcome(model) < EVENTS_EACH * len(added.kept):
        return None, say("interactions-few-events", each=EVENTS_EACH, columns=len(added.kept))
    statistic, score = added.statistic, True
    if len(added.kept) <= MOST_FITTED:
        columns = (*range(p), *(p + k for k in added.kept))
        fit = column_fits(wide, known, [columns])[0]
        if fit is not None and fit.finite:
            statistic, score = max(0.0, 2.0 * (fit.log_likelihood - model.fit.log_likelihood)), False
    return Joint(len(pairs), aliased, statistic, chi_square_p(statistic, len(added.kept)), score), ""


def _table(joint: Joint) -> Table:
    columns = (
        TableColumn("test", say("interactions-test")),
        TableColumn("products", say("interactions-products"), "number"),
        TableColumn("aliased", say("interactions-aliased"), "number"),
        TableColumn("statistic", say("interactions-statistic"), "number"),
        TableColumn("df", say("form-heading-degrees-of-freedom"), "number"),
        TableColumn("p", say("form-heading-p"), "p"),
    )
    test = say("interactions-by-score" if joint.score else "interactions-by-likelihood")
    row = (test, joint.products, joint.aliased, joint.statistic, joint.df, joint.p)
    return Table("interactions", say("interactions-table"), columns, (row,))
