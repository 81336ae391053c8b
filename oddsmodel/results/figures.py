"""Figures as values: what is to be drawn, as plain numbers, before disclosure and drawing.

One class a kind of figure. All sequences are tuples of plain floats, ints or text.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal


@dataclass(frozen=True, slots=True)
class EstimateMark:
    """An estimate with its interval on the odds-ratio scale; a limit of None is one that does not exist."""

    label: str
    series: str
    estimate: float | None
    lower: float | None
    upper: float | None
    note: str = ""


@dataclass(frozen=True, slots=True)
class EstimatesFigure:
    """Odds ratios with intervals on a log axis, line at 1; `series` tells crude from adjusted or models apart."""

    id: str
    title: str
    alt: str
    marks: tuple[EstimateMark, ...]
    axis: str = "Odds ratio (log scale)"


@dataclass(frozen=True, slots=True)
class FlowFigure:
    """Records read, left out by reason in order, analysed. A count of None is withheld."""

    id: str
    title: str
    alt: str
    read: int | None
    left_out: tuple[tuple[str, int | None], ...]
    analysed: int | None
    events: int | None = None


@dataclass(frozen=True, slots=True)
class CalibrationGroup:
    predicted: float
    observed: float
    lower: float
    upper: float
    records: int
    events: int


@dataclass(frozen=True, slots=True)
class CalibrationFigure:
    """Observed share against predicted risk: groups, and a smooth curve with its band where there is one.

    smooth: points (predicted, observed); band: (predicted, lower limit, upper limit) of the curve.
    """

    id: str
    title: str
    alt: str
    groups: tuple[CalibrationGroup, ...]
    smooth: tuple[tuple[float, float], ...] = ()
    band: tuple[tuple[float, float, float], ...] = ()


@dataclass(frozen=True, slots=True)
class StepFigure:
    """A receiver operating characteristic curve: points (false positive share, true positive share)."""

    id: str
    title: str
    alt: str
    points: tuple[tuple[float, float], ...]
    area: float


@dataclass(frozen=True, slots=True)
class PrecisionFigure:
    """Precision against recall: points (recall, precision), the average precision, and the share of events."""

    id: str
    title: str
    alt: str
    points: tuple[tuple[float, float], ...]
    average: float
    share: float


@dataclass(frozen=True, slots=True)
class CurvePoint:
    """The odds ratio of a group of the column's values, at `x`, with its interval; the reference group has none."""

    x: float
    ratio: float
    records: int
    lower: float | None = None
    upper: float | None = None


@dataclass(frozen=True, slots=True)
class CurveFigure:
    """Odds ratio against the value of a number column, relative to `reference`, log axis.

    `straight` is the same relation from the model with a straight line. `density` holds (lower edge,
    upper edge, records) of bins of the column. `points`: of groups, in place of a curve, which is then empty.
    """

    id: str
    title: str
    alt: str
    x_label: str
    x: tuple[float, ...]
    curve: tuple[float, ...]
    lower: tuple[float, ...]
    upper: tuple[float, ...]
    straight: tuple[float, ...]
    reference: float
    density: tuple[tuple[float, float, int | None], ...] = ()
    points: tuple[CurvePoint, ...] = ()


@dataclass(frozen=True, slots=True)
class SpreadFigure:
    """One odds ratio under many choices of adjustment columns, rising, on a log axis: as `reported`, and `alone`, with
    no adjustment, None where there is none or it is withheld."""

    id: str
    title: str
    alt: str
    estimates: tuple[float, ...]
    reported: float
    alone: float | None = None


@dataclass(frozen=True, slots=True)
class HistogramFigure:
    """Shares over the same bins for two or more groups; `counts` per series, None where withheld."""

    id: str
    title: str
    alt: str
    x_label: str
    edges: tuple[float, ...]
    series: tuple[tuple[str, tuple[int | None, ...]], ...]


@dataclass(frozen=True, slots=True)
class ScatterFigure:
    """Points of covariate patterns; `records` is each pattern's number of records (disclosure reads it)."""

    id: str
    title: str
    alt: str
    x_label: str
    y_label: str
    x: tuple[float, ...]
    y: tuple[float, ...]
    size: tuple[float, ...]
    records: tuple[int, ...]
    lines: tuple[float, ...] = field(default=())
    kind: Literal["scatter"] = "scatter"


@dataclass(frozen=True, slots=True)
class EnvelopeFigure:
    """Ordered values against their expected order, with the smallest, mean and largest of simulated ones.

    A point is the mean of a run of neighbours: `values` of them (of covariate patterns), which hold `records` records.
    """

    id: str
    title: str
    alt: str
    x_label: str
    y_label: str
    x: tuple[float, ...]
    observed: tuple[float, ...]
    middle: tuple[float, ...]
    lower: tuple[float, ...]
    upper: tuple[float, ...]
    values: tuple[int, ...]
    records: tuple[int, ...]


Figure = (
    EstimatesFigure
    | FlowFigure
    | CalibrationFigure
    | StepFigure
    | PrecisionFigure
    | CurveFigure
    | SpreadFigure
    | HistogramFigure
    | ScatterFigure
    | EnvelopeFigure
)
