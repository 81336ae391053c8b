"""Figures after coarsening: no mark stands for fewer records than the threshold."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from statsmodels.stats.proportion import proportion_confint

from oddsmodel.disclosure.calibration import coarsen_calibration, merge_groups
from oddsmodel.disclosure.curve import coarsen_curve
from oddsmodel.disclosure.histogram import coarsen_histogram
from oddsmodel.disclosure.scatter import coarsen_scatter
from oddsmodel.disclosure.steps import coarsen_steps
from oddsmodel.results.figures import (
    CalibrationFigure,
    CalibrationGroup,
    CurveFigure,
    HistogramFigure,
    ScatterFigure,
    StepFigure,
)


def group(predicted: float, records: int, events: int) -> CalibrationGroup:
    return CalibrationGroup(predicted, events / records, 0.0, 1.0, records, events)


@settings(deadline=None, derandomize=True, max_examples=200)
@given(
    sizes=st.lists(st.tuples(st.integers(0, 30), st.integers(0, 30)).filter(any), min_size=1, max_size=12),
    threshold=st.integers(2, 10),
)
def test_merged_calibration_groups_hold_no_small_count(sizes: list[tuple[int, int]], threshold: int) -> None:
    groups = [group((k + 1) / 20, e + o, e) for k, (e, o) in enumerate(sizes)]
    merged = merge_groups(groups, threshold)
    for one in merged:
        for count in (one.records, one.events, one.records - one.events):
            assert count == 0 or count >= threshold
        assert one.observed == one.events / one.records
        assert one.records > 0
    assert [one.predicted for one in merged] == sorted(one.predicted for one in merged)
    if merged:
        assert sum(one.records for one in merged) == sum(e + o for e, o in sizes)
        assert sum(one.events for one in merged) == sum(e for e, _ in sizes)
        mean = sum(one.predicted * one.records for one in merged)
        assert mean == pytest.approx(sum(one.predicted * one.records for one in groups))


def test_limits_of_a_merged_group_are_wilsons() -> None:
    """Against statsmodels' Wilson interval."""
    (merged,) = merge_groups([group(0.1, 20, 2), group(0.2, 30, 4), group(0.3, 10, 3)], 7, 0.9)
    assert (merged.records, merged.events) == (60, 9)
    lower, upper = proportion_confint(9, 60, alpha=0.1, method="wilson")
    assert (merged.lower, merged.upper) == pytest.approx((lower, upper), rel=1e-12)


def test_calibration_smooth_ends_with_the_groups_and_says_that_they_were_merged() -> None:
    smooth = ((0.001, 0.0), (0.15, 0.1), (0.99, 1.0))
    figure = CalibrationFigure("c", "", "Groups.", (group(0.1, 50, 3), group(0.2, 50, 9), group(0.4, 50, 20)), smooth)
    coarse = coarsen_calibration(figure, 5, 0.95)
    assert coarse is not None
    assert len(coarse.groups) == 2
    assert coarse.smooth == ((0.15, 0.1),)
    assert coarse.alt.startswith("Groups. Neighbouring groups are merged")
    assert coarsen_calibration(CalibrationFigure("c", "", "", (group(0.1, 50, 2),)), 5, 0.95) is None


def steps_of(events: int, others: int, seed: int = 1) -> StepFigure:
    order = np.random.default_rng(seed).permutation(np.repeat([1, 0], [events, others]))
    true, false = np.cumsum(order) / events, np.cumsum(1 - order) / others
    points = ((0.0, 0.0), *zip(false.tolist(), true.tolist(), strict=True))
    return StepFigure("roc", "", "", points, 0.5)


@pytest.mark.parametrize(("events", "others"), [(500, 4000), (40, 60), (12, 3000)])
def test_no_single_step_of_the_curve_can_be_seen(events: int, others: int) -> None:
    figure = steps_of(events, others)
    coarse = coarsen_steps(figure, 5, events, others)
    assert coarse is not None
    points = coarse.points
    assert len(points) <= 41
    assert points[0] == (0.0, 0.0)
    assert points[-1] == (1.0, 1.0)
    gaps = {round(later[0] - earlier[0], 9) for earlier, later in pairwise(points)}
    assert len(gaps) == 1
    assert min(gaps) * others >= 5
    assert (len(points) - 1) * 5 <= events or len(points) == 41
    for share, height in points[1:-1]:
        assert height * 50 == pytest.approx(round(height * 50))
        # numpy's interpolation of the corners, where the curve does not rise straight up
        nearby = np.interp([share - 1 / others, share + 1 / others], *zip(*figure.points, strict=True))
        assert nearby[0] - 0.02 <= height <= nearby[1] + 0.02 + 5 / events
    assert coarse.area == figure.area


def test_a_curve_of_too_few_is_not_drawn() -> None:
    assert coarsen_steps(steps_of(9, 1000), 5, 9, 1000) is None


def test_histogram_bins_are_withheld_with_a_companion() -> None:
    counts = ((40, 20, 9, 3, 0), (200, 100, 7, 2, 1))
    figure = HistogramFigure("h", "", "", "Risk", (0, 1, 2, 3, 4, 5), tuple(zip("ab", counts, strict=True)))
    made = coarsen_histogram(figure, 5)
    assert made is not None
    (_, first), (_, second) = made[0].series
    assert first == (40, 20, None, None, 0)
    assert second[3:] == (None, None)
    assert made[1] == sum(count is None for count in (*first, *second))
    for shown, true in zip((first, second), counts, strict=True):
        hidden = [value for value, kept in zip(true, shown, strict=True) if kept is None]
        assert len(hidden) >= 2
        assert sum(hidden) >= 5
    few = HistogramFigure("h", "", "", "Risk", (0, 1, 2), (("a", (3, 0)), ("b", (100, 90))))
    assert coarsen_histogram(few, 5) is None


def curve(density: tuple[tuple[float, float, int | None], ...]) -> CurveFigure:
    x = tuple(float(value) for value in range(18, 103))
    values = tuple(1 + value / 100 for value in x)
    return CurveFigure("l", "", "", "Age", x, values, values, values, values, 50.0, density)


def test_the_oldest_person_is_not_on_the_curve() -> None:
    """The last bins hold one and two records; the axis ends before them, its bins hold no small count."""
    counts = (3, 40, 60, 70, 2, 60, 50, 30, 9, 4, 2, 1)
    bins = tuple((18.0 + 7 * k, 25.0 + 7 * k, count) for k, count in enumerate(counts))
    coarse = coarsen_curve(curve(bins), 5)
    assert coarse is not None
    shown = [records for _, _, records in coarse.density]
    assert all(records is not None and (records == 0 or records >= 5) for records in shown)
    first, last = coarse.density[0][0], coarse.density[-1][1]
    assert first <= min(coarse.x)
    assert max(coarse.x) <= last
    outside = [count for lower, upper, count in bins if upper <= first or lower >= last]
    assert sum(outside[:2]) >= 5
    assert sum(count for (lower, _, _), count in zip(bins, counts, strict=True) if lower >= last) >= 5
    lengths = {len(values) for values in (coarse.x, coarse.curve, coarse.lower, coarse.upper, coarse.straight)}
    assert lengths == {len(coarse.x)}
    assert all(later[0] >= earlier[1] for earlier, later in pairwise(coarse.density))


def test_edges_of_bins_are_rounded() -> None:
    bins = tuple((18.137 + 7.219 * k, 25.356 + 7.219 * k, 50) for k in range(11))
    coarse = coarsen_curve(curve(bins), 5)
    assert coarse is not None
    assert all(edge == round(edge, 0) for lower, upper, _ in coarse.density for edge in (lower, upper))


def test_a_curve_without_bins_loses_its_ends_and_one_of_few_records_is_not_drawn() -> None:
    coarse = coarsen_curve(curve(()), 5)
    assert coarse is not None
    assert (min(coarse.x), max(coarse.x)) == (23.0, 97.0)
    assert coarsen_curve(curve(((18.0, 60.0, 4), (60.0, 103.0, 4))), 5) is None


def test_points_are_gathered_until_none_stands_for_a_few() -> None:
    random = np.random.default_rng(3)
    x, y = random.uniform(0, 1, 400), random.exponential(2, 400)
    records = random.integers(1, 4, 400)
    figure = ScatterFigure(
        "s", "", "Points.", "Risk", "Fall", tuple(x.tolist()), tuple(y.tolist()), (1.25,) * 400, tuple(records.tolist())
    )
    coarse = coarsen_scatter(figure, 5)
    assert coarse is not None
    assert min(coarse.records) >= 5
    assert sum(coarse.records) <= records.sum()
    assert set(coarse.size) == {1.2}
    assert not set(coarse.x) & set(figure.x)
    assert "fewer than 5 records are not drawn" in coarse.alt
    assert len(coarse.x) == len(coarse.y) == len(coarse.size) == len(coarse.records)
    lonely = ScatterFigure("s", "", "", "", "", (0.0, 1.0), (0.0, 1.0), (1.0, 1.0), (1, 2))
    assert coarsen_scatter(lonely, 5) is None
    assert coarsen_scatter(ScatterFigure("s", "", "", "", "", (), (), (), ()), 5) is None
