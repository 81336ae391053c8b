"""The receiver operating characteristic curve and the area under it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import expit, logit

from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.probability_groups import CLASSES
from oddsmodel.measures.wald import normal_quantile
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import StepFigure
from oddsmodel.results.study import CheckResult
from oddsmodel.results.tables import Interval, Table, TableColumn
from oddsmodel.wording import say

Array = NDArray[np.float64]

MOST_POINTS = 200

NEGLIGIBLE = 5e-5
"""An error of the area that would show in four decimals."""


@dataclass(frozen=True)
class Area:
    """standard_error is None where either outcome has fewer than two records."""

    area: float
    standard_error: float | None


def area_under_curve(events: Array, others: Array) -> Area:
    """Area under the curve with its standard error, from counts at rising scores.

    events, others (j,): records with and without the event at each distinct score; both have a positive total.

    The area is the share of pairs, one record of either outcome, in which the record with the event has the
    higher score, ties counting one half. DeLong, DeLong & Clarke-Pearson 1988, Biometrics 44:837-845, equations
    3 to 5: with placements V10 of the n1 events among the n0 others and V01 of the others among the events,

        variance = S10 / n1 + S01 / n0,    S10 = sum (V10 − area)² / (n1 − 1),  S01 likewise.

    >>> normal, abnormal = np.array([33.0, 6, 6, 11, 2]), np.array([3.0, 2, 2, 11, 33])
    >>> answer = area_under_curve(abnormal, normal)
    >>> round(answer.area, 3), round(answer.standard_error, 4)
    (0.893, 0.0307)
    """
    n1, n0 = float(events.sum()), float(others.sum())
    above_others = (np.cumsum(others) - others / 2.0) / n0
    below_events = (n1 - np.cumsum(events) + events / 2.0) / n1
    area = float(events @ above_others) / n1
    if n1 < 2 or n0 < 2:
        return Area(area, None)
    s10 = float(events @ (above_others - area) ** 2) / (n1 - 1.0)
    s01 = float(others @ (below_events - area) ** 2) / (n0 - 1.0)
    return Area(area, float(np.sqrt(s10 / n1 + s01 / n0)))


def area_error(events: Array, others: Array) -> float:
    """How far the area can be off where records are counted in classes of the score, events and others (j,).

    Pairs within a class count one half; each could count 0 or 1, and pairs in different classes are exact.
    """
    return float(events @ others) / (2.0 * float(events.sum()) * float(others.sum()))


def check(model: FittedModel) -> CheckResult:
    """Area under the curve of the fitted probabilities, on the records that the model was fitted to."""
    title, explanation = say("roc-title"), say("roc-explanation")
    seen = one_pass(model)
    ordered = seen.ordered
    events, others = ordered.events, ordered.records - ordered.events
    if not (events.any() and others.any()):
        reason = say("roc-one-outcome")
        nothing = dict.fromkeys(("estimate", "standard_error", "lower", "upper"))
        return CheckResult(
            name="auc",
            family="fit",
            title=title,
            verdict="not applicable",
            line="",
            statistics=nothing,
            reasons=dict.fromkeys(nothing, reason),
            explanation=explanation,
        )
    answer = area_under_curve(events, others)
    if model.grouping is not None:
        answer = Area(answer.area, None)
        lower, upper, reason = None, None, say("no-check-of-grouped-records")
    else:
        lower, upper, reason = _interval(answer, model.level)
    statistics = {"estimate": answer.area, "standard_error": answer.standard_error, "lower": lower, "upper": upper}
    reasons = {name: reason for name, value in statistics.items() if value is None}
    note = reason
    if seen.classed:
        bound = statistics["error_bound"] = area_error(events, others)
        if bound > NEGLIGIBLE:
            note = f"{reason} {say('roc-classes', classes=CLASSES, bound=bound)}".strip()
    points = _points(events, others)
    return CheckResult(
        name="auc",
        family="fit",
        title=title,
        verdict="fine",
        line="",
        statistics=statistics,
        reasons=reasons,
        tables=(_table(answer, lower, upper, model.level, note),),
        figures=(StepFigure("roc", title, say("roc-alt", area=answer.area), points, answer.area),),
        explanation=explanation,
    )


def _interval(answer: Area, level: float) -> tuple[float | None, float | None, str]:
    """Limits on the logit scale, logit(area) ± z·standard error / (area (1 − area)), or why there are none."""
    area, error = answer.area, answer.standard_error
    if error is None:
        return None, None, say("roc-one-record")
    if area in (0.0, 1.0):
        return None, None, say("roc-no-overlap", area=area)
    if error < 1e-12:
        return None, None, say("roc-no-spread")
    reach = normal_quantile(level) * error / (area * (1.0 - area))
    centre = float(logit(area))
    return float(expit(centre - reach)), float(expit(centre + reach)), ""


def _points(events: Array, others: Array) -> tuple[tuple[float, float], ...]:
    """Corners of the curve, thinned to about equal lengths along it where there are more than 200."""
    true_share = np.concatenate(([0.0], np.cumsum(events[::-1]))) / events.sum()
    false_share = np.concatenate(([0.0], np.cumsum(others[::-1]))) / others.sum()
    if true_share.size > MOST_POINTS:
        walked = true_share + false_share
        chosen = np.unique(np.searchsorted(walked, np.linspace(0.0, 2.0, MOST_POINTS - 1)[:-1]))
        chosen = np.append(chosen[chosen < walked.size - 1], walked.size - 1)
        true_share, false_share = true_share[chosen], false_share[chosen]
    return tuple(zip(false_share.tolist(), true_share.tolist(), strict=True))


def _table(answer: Area, lower: float | None, upper: float | None, level: float, note: str) -> Table:
    columns = (
        TableColumn("area", "Area under the curve", "number"),
        TableColumn("standard_error", "Standard error", "number"),
        TableColumn("interval", f"{round(100 * level, 1):g}% interval", "interval"),
    )
    row = (answer.area, answer.standard_error, Interval(lower, upper))
    return Table("area_under_curve", "Area under the curve", columns, (row,), note=note)
