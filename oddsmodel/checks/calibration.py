"""Calibration: the observed share of events beside the fitted probability, on the fitting records."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.probability_groups import OrderedRecords
from oddsmodel.checks.smooth import smooth_share
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.measures.wald import normal_quantile
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import CalibrationFigure, CalibrationGroup
from oddsmodel.results.study import CheckResult
from oddsmodel.wording import finding, say

Array = NDArray[np.float64]

GROUPS_OUTSIDE = 3
RELATIVE_GAP = 0.1


def wilson(events: Array, records: Array, level: float) -> tuple[Array, Array]:
    """Limits of the shares events / records (g,), records above 0 (Wilson 1927).

    Journal of the American Statistical Association 22:209-212.
    """
    z = normal_quantile(level)
    share = events / records
    whole = 1.0 + z * z / records
    centre = (share + z * z / (2.0 * records)) / whole
    reach = z / whole * np.sqrt(share * (1.0 - share) / records + z * z / (4.0 * records**2))
    lower = np.where(events == 0.0, 0.0, centre - reach)
    upper = np.where(events == records, 1.0, centre + reach)
    return np.asarray(lower), np.asarray(upper)


def check(model: FittedModel) -> CheckResult:
    """Observed share and mean fitted probability in tenths of the fitted probability, with a smooth curve.

    A description: on the fitting records the overall level and slope agree by construction, and are not shown.
    "Look" where at least three intervals leave out the fitted probability and the mean gap is above a tenth of the
    share of the rarer outcome. Withheld where the design knows no risk.
    """
    title, explanation = say("calibration-title"), say("calibration-explanation")
    names = ("groups", "mean_gap", "largest_gap", "groups_outside")
    if model.study_design not in QUANTITY:
        reason = say("calibration-no-risk", design=model.study_design)
        return CheckResult(
            name="calibration",
            family="fit",
            title=title,
            verdict="not applicable",
            line=reason,
            statistics=dict.fromkeys(names),
            reasons=dict.fromkeys(names, reason),
            explanation=reason,
        )
    ordered = one_pass(model).ordered
    groups = ordered.tenths
    marks = calibration_groups(groups, model.level)
    lower, upper = np.array([(one.lower, one.upper) for one in marks]).T
    gap = np.abs(groups.events / groups.records - groups.probability)
    # Where every record has its own probability of 0 or 1 to within rounding, rounding alone is no departure.
    outside = int(((groups.probability < lower - 1e-9) | (groups.probability > upper + 1e-9)).sum())
    mean_gap = float(gap @ groups.records / groups.records.sum())
    share = min(model.events, model.records - model.events) / model.records
    facts = {
        "groups": int(gap.size),
        "mean_gap": mean_gap,
        "largest_gap": float(gap.max()),
        "groups_outside": outside,
    }
    looks = outside >= GROUPS_OUTSIDE and mean_gap > RELATIVE_GAP * share
    return CheckResult(
        name="calibration",
        family="fit",
        title=title,
        verdict="look" if looks else "fine",
        line=say("calibration-line", looks=looks, level=model.level, **facts),
        statistics=facts,
        findings=(finding("note", "calibration-departs", level=model.level, **facts),) if looks else (),
        figures=(_figure(ordered, marks, title),),
        explanation=explanation,
    )


def calibration_groups(groups: OrderedRecords, level: float) -> tuple[CalibrationGroup, ...]:
    """Observed shares with Wilson's limits beside mean fitted probabilities."""
    lower, upper = wilson(groups.events, groups.records, level)
    return tuple(
        CalibrationGroup(
            predicted=float(groups.probability[number]),
            observed=float(groups.events[number] / groups.records[number]),
            lower=float(lower[number]),
            upper=float(upper[number]),
            records=round(float(groups.records[number])),
            events=round(float(groups.events[number])),
        )
        for number in range(groups.records.size)
    )


def _figure(ordered: OrderedRecords, marks: tuple[CalibrationGroup, ...], title: str) -> CalibrationFigure:
    smooth = smooth_share(ordered.probability, ordered.records, ordered.events)
    return CalibrationFigure("calibration", title, say("calibration-alt", groups=len(marks)), marks, smooth)
