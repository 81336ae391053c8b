"""Pictures of odds ratios: crude beside adjusted, and the models side by side."""

from __future__ import annotations

from collections.abc import Sequence

from oddsmodel.measures.compare_models import exposure_coefficients, exposure_keys
from oddsmodel.measures.intervals import lead_interval
from oddsmodel.results.figures import EstimateMark, EstimatesFigure
from oddsmodel.results.study import CoefficientResult, ModelResult, ProfileResult, WaldResult
from oddsmodel.results.tables import Interval
from oddsmodel.wording import say


def crude_and_adjusted_figure(coefficients: Sequence[CoefficientResult]) -> EstimatesFigure | None:
    """The crude and the adjusted odds ratio of each exposure coefficient that is shown; None where there is none."""
    marks = []
    for one in coefficients:
        if one.role != "exposure" or one.odds_ratio is None:
            continue
        if one.crude is not None and one.crude.odds_ratio is not None:
            marks.append(_mark(one.label, "Crude", one.crude.odds_ratio, one.crude.profile, one.crude.wald))
        marks.append(_mark(one.label, "Adjusted", one.odds_ratio, one.profile, one.wald))
    if not marks:
        return None
    alt = say("crude-and-adjusted-alt", labels=list(dict.fromkeys(mark.label for mark in marks)))
    return EstimatesFigure("crude_and_adjusted", "Crude and adjusted odds ratios", alt, tuple(marks))


def models_figure(models: Sequence[ModelResult]) -> EstimatesFigure | None:
    """The same odds ratios on one axis, a series for each model; None with fewer than two models."""
    if len(models) < 2:
        return None
    marks = []
    for key, label in exposure_keys(models).items():
        for model in models:
            coefficient = exposure_coefficients(model).get(key)
            if coefficient is None or coefficient.odds_ratio is None:
                continue
            marks.append(_mark(label, model.name, coefficient.odds_ratio, coefficient.profile, coefficient.wald))
    if not marks:
        return None
    title = "Odds ratios under each model"
    return EstimatesFigure("models", title, say("compare-models-alt", models=[m.name for m in models]), tuple(marks))


def _mark(
    label: str, series: str, odds_ratio: float, profile: ProfileResult | None, wald: WaldResult | None
) -> EstimateMark:
    limits = lead_interval(profile, wald)
    lower, upper = (limits.lower, limits.upper) if isinstance(limits, Interval) else (None, None)
    return EstimateMark(label, series, odds_ratio, lower, upper)
