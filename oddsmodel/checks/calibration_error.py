"""Calibration in numbers: how far the smooth observed share lies from the fitted probability, and its test."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.brier_parts import BrierParts, brier_parts
from oddsmodel.checks.calibration import RELATIVE_GAP, calibration_groups
from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.probability_groups import OrderedRecords, group_starts
from oddsmodel.checks.smooth import drawn_at, local_lines, too_few
from oddsmodel.checks.spiegelhalter import Spiegelhalter, spiegelhalter
from oddsmodel.design.weighted import weighted_quantiles
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.measures.wald import normal_quantile
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import CalibrationFigure
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import finding, say

Array = NDArray[np.float64]
Points = tuple[tuple[float, float], ...]
Band = tuple[tuple[float, float, float], ...]

NAME = "calibration_error"

MOST_BINS = 500
"""More different probabilities than these are put into so many bins of about equal numbers of records."""

CHANCE = 2.0
"""The mean error counts as seen from so many times on what chance gives."""

THOUSAND = 1000.0
"""The parts of the Brier score are shown in thousandths: some are far smaller than others."""

ERRORS = ("integrated", "median", "ninetieth", "largest", "by_chance")
TEST = ("spiegelhalter_z", "spiegelhalter_p")
PARTS = ("reliability", "resolution", "uncertainty", "within_variance", "within_covariance")
STATISTICS = (*ERRORS, *TEST, "score", *PARTS)


@dataclass(frozen=True)
class Errors:
    """Distances of the smooth observed share from the fitted probability over the records.

    integrated: their mean, the integrated calibration index; median and ninetieth: quantiles, E50 and E90; largest: the
    maximum. by_chance: the mean that is to be expected where the probabilities are right and from elsewhere.
    """

    integrated: float
    median: float
    ninetieth: float
    largest: float
    by_chance: float


def calibration_errors(ordered: OrderedRecords) -> Errors | None:
    """Austin & Steyerberg 2019, Statistics in Medicine 38:4051-4065, with the curve of `smooth_share`.

    The curve is linear in the outcomes and leaves a straight line as it is: where the probabilities are right, its
    distance from them at a point is normal about 0 with variance s², and the mean distance sqrt(2/π) s. None where
    there are too few records for a curve.
    """
    if too_few(ordered.probability, ordered.records):
        return None
    bins = _binned(ordered)
    p, records = bins.probability, bins.records
    lines = local_lines(p, p, records)
    distance = np.abs(np.clip(lines @ (bins.events / records), 0.0, 1.0) - p)
    error = np.sqrt(lines**2 @ (bins.variance / records**2))
    order = np.argsort(distance, kind="stable")
    quantiles = weighted_quantiles(distance[order], (0.5, 0.9), records[order])
    return Errors(
        integrated=float(np.average(distance, weights=records)),
        median=float(quantiles[0]),
        ninetieth=float(quantiles[1]),
        largest=float(distance.max()),
        by_chance=math.sqrt(2.0 / math.pi) * float(np.average(error, weights=records)),
    )


def smooth_with_band(ordered: OrderedRecords, level: float) -> tuple[Points, Band]:
    """The points of the smooth curve, and its limits at each: the curve ± z standard errors, within 0 and 1.

    Pointwise: from the curve's own shares y, with variance sum l² y (1 − y) / n where each of n records counts l.
    Records are taken as independent, the probabilities as given.
    """
    if too_few(ordered.probability, ordered.records):
        return (), ()
    bins = _binned(ordered)
    p, records = bins.probability, bins.records
    grid = drawn_at(p, records)
    share = np.clip(local_lines(p, p, records) @ (bins.events / records), 0.0, 1.0)
    lines = local_lines(grid, p, records)
    curve = lines @ (bins.events / records)
    reach = normal_quantile(level) * np.sqrt(lines**2 @ (share * (1.0 - share) / records))
    middle, lower, upper = np.clip([curve, curve - reach, curve + reach], 0.0, 1.0).tolist()
    return tuple(zip(grid.tolist(), middle, strict=True)), tuple(zip(grid.tolist(), lower, upper, strict=True))


def _binned(ordered: OrderedRecords) -> OrderedRecords:
    starts = group_starts(ordered.records, MOST_BINS)
    return ordered.summed(starts) if ordered.records.size > MOST_BINS else ordered


def check(model: FittedModel) -> CheckResult:
    """Errors of calibration, Spiegelhalter's test, and the Brier score taken apart.

    Descriptions of the records fitted, which flatter; level and slope of calibration are 0 and 1 there by construction
    and are not among them. "Look" where the mean error is above a tenth of the share of the rarer outcome and chance
    does not readily explain it. Withheld where the design knows no risk.
    """
    title, explanation = say("calibration-error-title"), say("calibration-error-explanation")
    reason = None
    if model.study_design not in QUANTITY:
        reason = say("calibration-error-no-risk", design=model.study_design)
    elif not 0 < model.events < model.records:
        reason = say("prediction-one-outcome")
    if reason is not None:
        nothing = dict.fromkeys(STATISTICS)
        return CheckResult(
            name=NAME,
            family="fit",
            title=title,
            verdict="not applicable",
            line=reason,
            statistics=nothing,
            reasons=dict.fromkeys(nothing, reason),
            explanation=explanation,
        )
    seen = one_pass(model)
    ordered = seen.ordered
    errors = calibration_errors(ordered)
    test, untested = _test(model)
    parts = brier_parts(ordered.tenths, seen.sums.brier)
    statistics: dict[str, float | int | None] = {
        name: None if errors is None else getattr(errors, name) for name in ERRORS
    }
    statistics |= {"spiegelhalter_z": test.z if test else None, "spiegelhalter_p": test.p if test else None}
    statistics |= parts._asdict()
    reasons = {
        name: untested if name in TEST else say("calibration-error-few")
        for name, value in statistics.items()
        if value is None
    }
    share = min(model.events, model.records - model.events) / model.records
    facts = {"errors": None if errors is None else [errors.integrated, errors.by_chance], "p": test.p if test else None}
    looks = errors is not None and errors.integrated > RELATIVE_GAP * share and _beyond_chance(errors, test)
    verdict: Verdict = "look" if looks else "fine"
    line = say("calibration-error-line", looks=looks, **facts)
    return CheckResult(
        name=NAME,
        family="fit",
        title=title,
        verdict=verdict,
        line=line,
        statistics=statistics,
        reasons=reasons,
        findings=(finding("note", "calibration-error-seen", looks=looks, **facts),) if looks else (),
        tables=(*_errors_table(errors, test), _parts_table(parts)),
        figures=(_figure(model, ordered),),
        explanation=explanation,
    )


def _beyond_chance(errors: Errors, test: Spiegelhalter | None) -> bool:
    return errors.integrated > CHANCE * errors.by_chance or (test is not None and test.p < 0.01)


def _test(model: FittedModel) -> tuple[Spiegelhalter | None, str]:
    """Spiegelhalter's test, or why there is none."""
    if model.grouping is not None:
        return None, say("no-check-of-grouped-records")
    test = spiegelhalter(model.fit)
    if test is None:
        return None, say("spiegelhalter-nothing-left")
    return (test, "") if test.near_normal else (None, say("spiegelhalter-not-normal"))


def _figure(model: FittedModel, ordered: OrderedRecords) -> CalibrationFigure:
    groups = calibration_groups(ordered.tenths, model.level)
    smooth, band = smooth_with_band(ordered, model.level)
    return CalibrationFigure(
        "calibration_band",
        say("calibration-band-title"),
        say("calibration-band-alt", groups=len(groups)),
        groups,
        smooth,
        band if model.grouping is None else (),
    )


def _errors_table(errors: Errors | None, test: Spiegelhalter | None) -> tuple[Table, ...]:
    columns = (
        TableColumn("measure", say("calibration-error-heading-measure")),
        TableColumn("value", say("calibration-error-heading-value"), "number"),
    )
    rows = [] if errors is None else [(say(f"calibration-error-{name}"), getattr(errors, name)) for name in ERRORS]
    made = [Table("calibration_error", say("calibration-error-table"), columns, tuple(rows))] if rows else []
    if test is not None:
        headings = (
            TableColumn("statistic", say("spiegelhalter-heading-statistic")),
            TableColumn("z", say("spiegelhalter-heading-z"), "number"),
            TableColumn("p", say("spiegelhalter-heading-p"), "p"),
        )
        row = (say("spiegelhalter-row"), test.z, test.p)
        made.append(Table("spiegelhalter", say("spiegelhalter-title"), headings, (row,)))
    return tuple(made)


def _parts_table(parts: BrierParts) -> Table:
    columns = (
        TableColumn("part", say("brier-parts-heading-part")),
        TableColumn("value", say("brier-parts-heading-value"), "number"),
    )
    signs = {"reliability": 1, "resolution": -1, "uncertainty": 1, "within_variance": 1, "within_covariance": -1}
    rows = [(say(f"brier-parts-{name}"), THOUSAND * sign * getattr(parts, name)) for name, sign in signs.items()]
    rows.append((say("brier-parts-score"), THOUSAND * parts.score))
    return Table("brier_parts", say("brier-parts-title"), columns, tuple(rows), note=say("brier-parts-note"))
