"""The Brier score: the mean squared distance between outcome and fitted probability."""

from __future__ import annotations

from typing import NamedTuple

from oddsmodel.checks.one_pass import one_pass
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import say


class Brier(NamedTuple):
    """score; maximum: that of giving everybody the overall share; scaled: 1 − score/maximum, None where that is 0."""

    score: float
    maximum: float
    scaled: float | None


def brier_score(total: float, records: float, events: float) -> Brier:
    """Mean of (y − p)² over all records (Brier 1950, Monthly Weather Review 78:1-3), from its total over them.

    The maximum and the scaled score are those of Steyerberg et al. 2010, Epidemiology 21:128-138.
    """
    score, share = total / records, events / records
    maximum = share * (1.0 - share)
    return Brier(score, maximum, 1.0 - score / maximum if maximum > 0.0 else None)


def check(model: FittedModel) -> CheckResult:
    """The Brier score on the fitting records, folded; withheld where the design knows no risk."""
    title, explanation = say("brier-title"), say("brier-explanation")
    if model.study_design not in QUANTITY:
        reason = say("brier-no-risk", design=model.study_design)
        nothing = dict.fromkeys(("score", "maximum", "scaled"))
        return CheckResult(
            name="brier",
            family="fit",
            title=title,
            verdict="not applicable",
            line="",
            statistics=nothing,
            reasons=dict.fromkeys(nothing, reason),
            explanation=reason,
        )
    brier = brier_score(one_pass(model).sums.brier, model.records, model.events)
    reason = "" if brier.scaled is not None else say("brier-one-outcome")
    columns = (
        TableColumn("score", "Brier score", "number"),
        TableColumn("maximum", "Same share for everybody", "number"),
        TableColumn("scaled", "Scaled score", "number"),
    )
    return CheckResult(
        name="brier",
        family="fit",
        title=title,
        verdict="fine",
        line="",
        statistics=brier._asdict(),
        reasons={"scaled": reason} if reason else {},
        tables=(Table("brier", title, columns, (tuple(brier),), note=reason),),
        explanation=explanation,
    )
