"""Discrimination beyond the ROC curve: precision and recall, Tjur's D, and the measures named after R²."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.probability_groups import OrderedRecords
from oddsmodel.checks.pseudo_r2 import gain
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import PrecisionFigure
from oddsmodel.results.study import CheckResult
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import say

Array = NDArray[np.float64]

NAME = "discrimination"

MOST_POINTS = 200

OF_LIKELIHOOD = ("mcfadden", "cox_snell", "nagelkerke")
STATISTICS = ("average_precision", "event_share", "tjur", *OF_LIKELIHOOD)


def precision_and_recall(events: Array, records: Array) -> tuple[Array, Array]:
    """Recall and precision (j,) with the cut at each score, from the highest down.

    events, records (j,): at each distinct score, rising. Recall is the share of the records with the event that lie at
    the cut or above; precision is the share of events among all records there.
    """
    found, taken = np.cumsum(events[::-1]), np.cumsum(records[::-1])
    return found / found[-1], found / taken


def average_precision(events: Array, records: Array) -> float:
    """Mean precision over the records with the event, each at its own score: sum of (R_k − R_{k−1}) P_k.

    Without a line between the points, which would flatter (Davis & Goadrich 2006, Proceedings of the 23rd International
    Conference on Machine Learning, 233-240).
    """
    recall, precision = precision_and_recall(events, records)
    return float(np.diff(recall, prepend=0.0) @ precision)


def coefficient_of_discrimination(ordered: OrderedRecords) -> float:
    """Mean fitted probability of records with the event less that of those without (Tjur 2009, Am Stat 63:366-372)."""
    events, others = ordered.events, ordered.records - ordered.events
    p = ordered.probability
    return float(events @ p) / float(events.sum()) - float(others @ p) / float(others.sum())


def check(model: FittedModel) -> CheckResult:
    """Descriptions on the records that the model was fitted to, folded.

    All of them depend on the share of events, which a case-control study fixes by its sampling: they are then left out.
    Those of the likelihood are left out where records belong to groups.
    """
    title, explanation = say("discrimination-title"), say("discrimination-explanation")
    reason = None
    if model.study_design not in QUANTITY:
        reason = say("discrimination-no-risk", design=model.study_design)
    elif not 0 < model.events < model.records:
        reason = say("prediction-one-outcome")
    if reason is not None:
        nothing = dict.fromkeys(STATISTICS)
        return CheckResult(
            name=NAME,
            family="fit",
            title=title,
            verdict="not applicable",
            line="",
            statistics=nothing,
            reasons=dict.fromkeys(nothing, reason),
            explanation=explanation,
        )
    ordered = one_pass(model).ordered
    average, share = average_precision(ordered.events, ordered.records), model.events / model.records
    statistics: dict[str, float | int | None] = dict.fromkeys(STATISTICS)
    statistics |= {"average_precision": average, "event_share": share}
    statistics["tjur"] = coefficient_of_discrimination(ordered)
    if model.grouping is None:
        known = gain(model)
        statistics |= {name: getattr(known, name) for name in OF_LIKELIHOOD}
    reasons = {name: say("no-check-of-grouped-records") for name, value in statistics.items() if value is None}
    return CheckResult(
        name=NAME,
        family="fit",
        title=title,
        verdict="fine",
        line="",
        statistics=statistics,
        reasons=reasons,
        tables=(_table(statistics),),
        figures=(_figure(ordered, average, share),),
        explanation=explanation,
    )


def _table(statistics: dict[str, float | int | None]) -> Table:
    columns = (
        TableColumn("measure", say("discrimination-heading-measure")),
        TableColumn("value", say("discrimination-heading-value"), "number"),
        TableColumn("is_not", say("discrimination-heading-is-not")),
    )
    rows = tuple(
        (say(f"discrimination-{name}"), statistics[name], say(f"discrimination-{name}-is-not"))
        for name in STATISTICS
        if name != "event_share" and statistics[name] is not None
    )
    return Table("discrimination", say("discrimination-table"), columns, rows)


def _figure(ordered: OrderedRecords, average: float, share: float) -> PrecisionFigure:
    recall, precision = precision_and_recall(ordered.events, ordered.records)
    kept = np.flatnonzero(recall > 0.0)
    if kept.size > MOST_POINTS:
        # evenly over the recall, the last point with all events among them
        kept = kept[np.unique(np.searchsorted(recall[kept], np.linspace(recall[kept[0]], 1.0, MOST_POINTS)))]
    points = tuple(zip(recall[kept].tolist(), precision[kept].tolist(), strict=True))
    return PrecisionFigure(
        "precision_recall",
        say("precision-title"),
        say("precision-alt", average=average, share=share),
        points,
        average,
        share,
    )
