"""The coarse curve of precision against recall, and the band of the calibration figure."""

from __future__ import annotations

import numpy as np
import pytest

from oddsmodel.disclosure.calibration import coarsen_calibration
from oddsmodel.disclosure.precision import coarsen_precision
from oddsmodel.results.figures import CalibrationFigure, CalibrationGroup, PrecisionFigure


def curve_of(events: int, others: int, seed: int = 1) -> PrecisionFigure:
    """Records in a random order of their probability that favours events."""
    rng = np.random.default_rng(seed)
    outcome = np.repeat([1, 0], [events, others])
    order = outcome[np.argsort(-(outcome + 1.5 * rng.normal(size=outcome.size)))]
    found = np.cumsum(order)
    recall, precision = found / events, found / np.arange(1, order.size + 1)
    kept = recall > 0
    points = tuple(zip(recall[kept].tolist(), precision[kept].tolist(), strict=True))
    return PrecisionFigure("precision_recall", "", "", points, 0.5, events / (events + others))


@pytest.mark.parametrize(("events", "others"), [(500, 4000), (40, 60), (12, 3000)])
@pytest.mark.parametrize("threshold", [5, 10])
def test_no_point_stands_for_fewer_records_than_may_be_told(events: int, others: int, threshold: int) -> None:
    figure = curve_of(events, others)
    coarse = coarsen_precision(figure, threshold, events, others)
    if coarse is None:
        assert events <= 4 * threshold
        return
    assert events >= 2 * threshold
    assert len(coarse.points) <= 20
    recall, precision = np.array(coarse.points).T
    assert np.diff(np.append(0.0, recall)).min() * events >= threshold - 1e-9
    assert precision * 50 == pytest.approx(np.rint(precision * 50))
    exact = dict(figure.points)
    for share, height in coarse.points:
        # the first point of the curve whose recall reaches the grid's
        reached = min(point for point in exact if point >= share - 1e-9)
        first = next(value for point, value in figure.points if point == reached)
        above = share * events * (1 / first - 1)
        assert above >= threshold
        assert others - above >= threshold or others - above < 0.5
        assert height == pytest.approx(first, abs=0.0101)
    assert (coarse.average, coarse.share) == (figure.average, figure.share)


def test_a_curve_without_false_alarms_is_not_drawn() -> None:
    perfect = tuple((k / 50, 1.0) for k in range(1, 51))
    assert coarsen_precision(PrecisionFigure("p", "", "", perfect, 1.0, 0.5), 5, 50, 50) is None
    assert coarsen_precision(PrecisionFigure("p", "", "", (), 1.0, 0.5), 5, 50, 50) is None


def test_the_band_ends_where_the_smooth_curve_does() -> None:
    groups = tuple(CalibrationGroup(p, p, p - 0.05, p + 0.05, 50, round(50 * p)) for p in (0.2, 0.4, 0.6))
    at = (0.1, 0.2, 0.5, 0.6, 0.7)
    figure = CalibrationFigure("c", "", "", groups, tuple((x, x) for x in at), tuple((x, x - 0.1, x + 0.1) for x in at))
    coarse = coarsen_calibration(figure, 5, 0.95)
    assert coarse is not None
    assert [x for x, _ in coarse.smooth] == [x for x, _, _ in coarse.band] == [0.2, 0.5, 0.6]
