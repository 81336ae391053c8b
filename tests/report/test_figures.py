"""Figures: geometry that can be worked out by hand, text that stays text, ids that do not clash."""

from __future__ import annotations

import math
from itertools import pairwise
from types import ModuleType
from xml.etree import ElementTree

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.report.figures import svg
from oddsmodel.report.figures.lettering import fold, width_of
from oddsmodel.report.figures.scales import plain_labels, plain_ticks, ratio_label, ratio_range, ratio_ticks
from oddsmodel.results.figures import EstimateMark, EstimatesFigure, Figure, HistogramFigure


def every_kind(sample: ModuleType) -> list[Figure]:
    return [
        sample.estimates_figure("a"),
        sample.flow_figure(sample.FLOW, "b"),
        sample.calibration_figure(),
        sample.roc_figure(),
        sample.curve_figure(),
        sample.points_figure(),
        sample.spread_figure(),
        sample.histogram_figure(),
        sample.scatter_figure(),
    ]


def texts(drawn: str) -> list[str]:
    return ["".join(element.itertext()) for element in ElementTree.fromstring(drawn).iter("text")]


def test_every_kind_is_self_contained(sample: ModuleType) -> None:
    for number, figure in enumerate(every_kind(sample)):
        drawn = svg(figure, f"figure-{number}")
        root = ElementTree.fromstring(drawn)
        assert root.get("role") == "img"
        assert [child.tag for child in root[:2]] == ["title", "desc"]
        assert root[0].text == figure.title
        assert root[1].text == figure.alt
        for element in root.iter():
            assert element.tag not in ("style", "script", "metadata", "image")
            assert element.get("id", f"figure-{number}-").startswith(f"figure-{number}-")
        assert texts(drawn), "text stays text, so that it can be found and read aloud"
        assert len(drawn) < 200_000


def test_colours_come_from_the_page(sample: ModuleType) -> None:
    for figure in every_kind(sample):
        drawn = svg(figure, "f")
        assert "var(--" in drawn
        assert "#" not in drawn.replace("url(#f-", ""), "no colour of its own"


def test_drawing_twice_gives_the_same(sample: ModuleType) -> None:
    for figure in every_kind(sample):
        assert svg(figure, "f") == svg(figure, "f")


def estimates(*marks: EstimateMark) -> str:
    return svg(EstimatesFigure("e", "Title", "Alternative", marks), "f")


def test_numbers_stand_beside_their_estimates() -> None:
    drawn = texts(
        estimates(EstimateMark("Dose", "adjusted", 2.0, 1.0, 4.0), EstimateMark("Age", "adjusted", 0.5, 0.4, 0.6))
    )
    assert "2.00\u20031.00 to 4.00" in drawn
    assert "0.50\u20030.40 to 0.60" in drawn
    assert drawn.index("Dose") < drawn.index("Age")


def test_the_axis_is_logarithmic_and_holds_one() -> None:
    """An interval from 1/4 to 4 about 1 is symmetric: its middle lies halfway between its ends."""
    root = ElementTree.fromstring(estimates(EstimateMark("Dose", "adjusted", 1.0, 0.25, 4.0)))
    paths = [element.get("d", "") for element in root.iter("path") if "stroke-width:2.2" in element.get("style", "")]
    start, _, end, _ = (float(step) for step in paths[0].removeprefix("M").split())
    marker = next(element for element in root.iter("circle") if "--first" in element.get("style", ""))
    assert float(marker.get("cx", "nan")) == pytest.approx((start + end) / 2, abs=0.11)


def heads(drawn: str) -> int:
    return sum("stroke-width:2;" in element.get("style", "") for element in ElementTree.fromstring(drawn).iter("path"))


def test_arrows_where_an_interval_leaves_the_axis_or_has_no_limit() -> None:
    assert heads(estimates(EstimateMark("Dose", "adjusted", 1.5, 1.2, 1.9))) == 0
    assert heads(estimates(EstimateMark("Dose", "adjusted", 1.5, 1.2, None))) == 1
    assert heads(estimates(EstimateMark("Dose", "adjusted", 1.5, None, None))) == 2
    assert heads(estimates(EstimateMark("Dose", "adjusted", 1.5, 1.2, 90000.0))) == 1


def test_no_estimate_is_said() -> None:
    drawn = texts(estimates(EstimateMark("Dose", "adjusted", None, None, None, note="Nobody was exposed.")))
    assert "no estimate" in drawn
    assert "Nobody was exposed." in drawn


def test_withheld_bins_are_empty_and_said() -> None:
    figure = HistogramFigure("h", "T", "A", "x", (0.0, 1.0, 2.0), (("a", (None, 8)), ("b", (3, 4))))
    assert "Bins whose count is withheld are left empty." in texts(svg(figure, "f"))


def test_figures_with_nothing_in_them_are_drawn(sample: ModuleType) -> None:
    empty = HistogramFigure("h", "T", "A", "x", (0.0, 1.0), (("a", (None,)), ("b", (0,))))
    assert texts(svg(empty, "f"))
    assert texts(svg(sample.scatter_figure(0), "f"))
    assert texts(estimates())


def test_a_crowded_scatter_stays_small(sample: ModuleType) -> None:
    assert len(svg(sample.scatter_figure(200_000), "f")) < 1_000_000


@settings(deadline=None, derandomize=True, max_examples=25)
@given(st.text(max_size=40))
def test_any_label_is_drawn_and_escaped(label: str) -> None:
    drawn = estimates(EstimateMark(label, label, 1.5, 1.2, 1.9, note=label))
    ElementTree.fromstring(drawn)
    assert "<script" not in drawn


def test_dollar_signs_and_backslashes_are_letters() -> None:
    assert "$x$ \\alpha_1 %" in texts(estimates(EstimateMark("$x$ \\alpha_1 %", "adjusted", 1.5, 1.2, 1.9)))


@settings(deadline=None, derandomize=True)
@given(st.floats(1e-5, 1e5), st.floats(1.01, 1e6))
def test_ticks_of_a_ratio_axis_are_inside_rising_and_apart(low: float, spread: float) -> None:
    low, high = ratio_range([low, low * spread], [])
    ticks = ratio_ticks(low, high, 200.0)
    assert ticks
    assert all(low <= tick <= high for tick in ticks)
    assert list(ticks) == sorted(set(ticks))
    places = [200.0 * math.log(tick / low) / math.log(high / low) for tick in ticks]
    assert all(b - a >= 37.9 for a, b in pairwise(places))


def test_round_ticks() -> None:
    assert ratio_ticks(0.4, 2.6, 200.0) == (0.5, 1.0, 2.0)
    assert [ratio_label(value) for value in (0.25, 0.5, 1.0, 10.0, 200.0)] == ["0.25", "0.5", "1", "10", "200"]
    assert plain_ticks(0.0, 1.0) == (0.0, 0.2, 0.4, 0.6, 0.8, 1.0)
    assert plain_labels(plain_ticks(1990.0, 2020.0)) == ["1990", "2000", "2010", "2020"]
    assert plain_labels((-1.0, 0.0, 0.5)) == ["−1.0", "0.0", "0.5"]
    assert plain_ticks(3.0, 3.0) == (3.0,)


@settings(deadline=None, derandomize=True)
@given(st.text(max_size=200), st.floats(30, 400))
def test_folded_text_fits(text: str, room: float) -> None:
    lines = fold(text, 12.0, room)
    assert 1 <= len(lines) <= 4
    assert all(width_of(line, 12.0) <= room + 13.0 for line in lines)
