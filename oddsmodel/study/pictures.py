"""The pictures that belong to a model itself: who was counted, and the exposure's odds ratios."""

from __future__ import annotations

from collections.abc import Sequence

from oddsmodel.measures.intervals import interval_of, lead_interval
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import EstimateMark, EstimatesFigure, FlowFigure
from oddsmodel.results.study import CoefficientResult
from oddsmodel.results.tables import Interval
from oddsmodel.study.prepare import Prepared
from oddsmodel.wording import say


def flow_figure(prepared: Prepared) -> FlowFigure:
    """Records read, left out by reason, analysed."""
    flow = prepared.flow
    left_out = tuple((one.reason, one.records) for one in flow.left_out)
    return FlowFigure(
        id=f"{prepared.id}-flow",
        title=say("flow-title", model=prepared.section.name),
        alt=say("flow-alt", read=flow.read or 0, analysed=flow.analysed or 0, left_out=left_out),
        read=flow.read,
        left_out=left_out,
        analysed=flow.analysed,
        events=flow.events,
    )


def estimates_figure(model: FittedModel, found: Sequence[CoefficientResult], identity: str) -> EstimatesFigure:
    """Crude (on the same records) and adjusted odds ratios of every exposure coefficient that has its own."""
    adjusted = bool(model.adjustment) or len(model.exposures) > 1
    marks: list[EstimateMark] = []
    for one in found:
        if one.role != "exposure" or not one.shown:
            continue
        if adjusted and one.crude is not None:
            limits = lead_interval(one.crude.profile, one.crude.wald)
            marks.append(_mark(one.label, "crude", one.crude.odds_ratio, limits))
        series = "adjusted" if adjusted else "crude"
        marks.append(_mark(one.label, series, one.odds_ratio, interval_of(one)))
    told = [(mark.label, mark.series, mark.estimate, mark.lower, mark.upper) for mark in marks]
    return EstimatesFigure(
        id=f"{identity}-estimates",
        title=say("estimates-title", model=model.name),
        alt=say("estimates-alt", marks=told, percent=round(100 * model.level, 1)),
        marks=tuple(marks),
    )


def _mark(label: str, series: str, estimate: float | None, limits: object) -> EstimateMark:
    if not isinstance(limits, Interval):
        return EstimateMark(label, series, estimate, None, None)
    return EstimateMark(label, series, estimate, limits.lower, limits.upper)
