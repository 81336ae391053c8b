"""Figures as inline SVG: one module a kind of figure."""

from __future__ import annotations

from oddsmodel.report.figures import (
    calibration,
    curve,
    envelope,
    estimates,
    flow,
    histogram,
    precision,
    roc,
    scatter,
    spread,
)
from oddsmodel.report.figures.canvas import Sheet
from oddsmodel.results import figures as values

__all__ = ["svg"]


def svg(figure: values.Figure, prefix: str) -> str:
    """The figure as an inline SVG element whose ids all begin with `prefix`."""
    return _sheet(figure).svg(prefix, figure.title, figure.alt)


def _sheet(figure: values.Figure) -> Sheet:
    match figure:
        case values.EstimatesFigure():
            return estimates.draw(figure)
        case values.FlowFigure():
            return flow.draw(figure)
        case values.CalibrationFigure():
            return calibration.draw(figure)
        case values.StepFigure():
            return roc.draw(figure)
        case values.PrecisionFigure():
            return precision.draw(figure)
        case values.CurveFigure():
            return curve.draw(figure)
        case values.SpreadFigure():
            return spread.draw(figure)
        case values.HistogramFigure():
            return histogram.draw(figure)
        case values.ScatterFigure():
            return scatter.draw(figure)
        case values.EnvelopeFigure():
            return envelope.draw(figure)
