"""Estimates of the invented study: a coefficient and the marks that are drawn of it."""

from __future__ import annotations

import math

from oddsmodel.results.figures import EstimateMark
from oddsmodel.results.study import (
    CoefficientResult,
    CrudeEstimate,
    ModelResult,
    ProfileResult,
    WaldResult,
)


def crude_odds_ratio(a: int, b: int, c: int, d: int) -> CrudeEstimate | None:
    """Odds ratio of the 2×2 table with Woolf's limits; None where a cell is 0."""
    if min(a, b, c, d) == 0:
        return None
    ratio, error = a * d / (b * c), math.sqrt(1 / a + 1 / b + 1 / c + 1 / d)
    limits = [ratio * math.exp(sign * 1.959963984540054 * error) for sign in (-1, 1)]
    return CrudeEstimate(a + b + c + d, ratio, WaldResult(limits[0], limits[1], 0.03), ProfileResult(*limits))


def coefficient(
    term: str,
    level: str | None,
    reference: str | None,
    role: str,
    label: str,
    ratio: float | None,
    crude: CrudeEstimate | None,
    everyone: CrudeEstimate | None = None,
) -> CoefficientResult:
    log = None if ratio is None else math.log(ratio)
    limits = (None, None) if ratio is None else (ratio * 0.7, ratio * 1.5)
    return CoefficientResult(
        term=term,
        level=level,
        reference=reference,
        levels=None,
        role=role,  # type: ignore[arg-type]
        label=label,
        log_odds_ratio=log,
        standard_error=None if ratio is None else 0.21,
        odds_ratio=ratio,
        wald=WaldResult(*limits, 0.2),
        profile=ProfileResult(*limits),
        crude=crude,
        crude_all_records=everyone and CrudeEstimate(everyone.records, everyone.odds_ratio),
        reasons={} if crude else {"crude": "There is no crude estimate."},
    )


def marks_of(coefficients: tuple[CoefficientResult, ...]) -> tuple[EstimateMark, ...]:
    marks = []
    for one in coefficients:
        if one.role != "exposure":
            continue
        if one.crude is not None and one.crude.wald is not None:
            limits = one.crude.wald
            marks.append(EstimateMark(one.label, "crude", one.crude.odds_ratio, limits.lower, limits.upper))
        marks.append(EstimateMark(one.label, "adjusted", one.odds_ratio, one.profile.lower, one.profile.upper))
    return tuple(marks)


def marks(model: ModelResult) -> tuple[EstimateMark, ...]:
    return marks_of(model.coefficients)
