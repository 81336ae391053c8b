"""Where a drawing puts things: positions worked out by hand, nothing off the page or outside its frame."""

from __future__ import annotations

import math
import re
from itertools import pairwise
from types import ModuleType
from xml.etree import ElementTree
from xml.etree.ElementTree import Element

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.report.figures import svg
from oddsmodel.report.figures.canvas import KeyEntry, Sheet
from oddsmodel.report.figures.plot import Plot, Scale
from oddsmodel.report.figures.strokes import SHAPES, Shape, marker, number, path, stroke
from oddsmodel.results.figures import (
    CalibrationFigure,
    CalibrationGroup,
    CurveFigure,
    HistogramFigure,
    ScatterFigure,
    StepFigure,
)

NUMBER = re.compile(r"-?\d+(?:\.\d+)?(?:e[+-]\d+)?")


def styled(root: Element, style: str) -> list[Element]:
    return [element for element in root.iter() if style in element.get("style", "")]


def points(data: str | None) -> list[tuple[float, float]]:
    """The points of a path given as one run of positions."""
    read = [float(one) for one in NUMBER.findall(data or "")]
    return list(zip(read[::2], read[1::2], strict=True))


def drawn(sheet: Sheet) -> Element:
    return ElementTree.fromstring(sheet.svg("f", "Title", "Alternative"))


def test_coordinates_are_short() -> None:
    assert [number(value) for value in (0.0, -0.04, 12.0, 12.34, -7.25001, 19_999.96)] == [
        "0",
        "0",
        "12",
        "12.3",
        "-7.3",
        "20000",
    ]
    assert path([0, 1.26], [2, 3.0]) == "M0 2 1.3 3"


def test_dashes_grow_with_the_line() -> None:
    assert "stroke-dasharray:4,2;" in stroke("M0 0 9 0", "red", 2.0, (2.0, 1.0)).replace('"/>', ';"/>')
    assert "linecap" not in stroke("M0 0 9 0", "red", 2.0, (2.0, 1.0))


@pytest.mark.parametrize("shape", SHAPES)
def test_a_marker_stands_about_its_place(shape: Shape) -> None:
    element = ElementTree.fromstring(marker(50.0, 40.0, shape, 8.0, "red", "none", 1.0))
    if shape == "circle":
        assert (element.get("cx"), element.get("cy"), element.get("r")) == ("50", "40", "4")
        return
    x, y = zip(*points(element.get("d")), strict=True)
    assert min(x) + max(x) == pytest.approx(100.0)
    assert min(y) + max(y) == pytest.approx(80.0)
    assert max(x) - min(x) == pytest.approx(8.0 * (math.sqrt(2.0) if shape == "diamond" else 1.0), abs=0.11)


def test_a_scale_puts_its_ends_at_its_ends() -> None:
    assert Scale(10.0, 20.0, 100.0, 300.0).at([10.0, 12.5, 20.0, 25.0]).tolist() == [100.0, 150.0, 300.0, 400.0]
    log = Scale(0.1, 10.0, 200.0, 0.0, log=True)
    assert log.at([0.1, 1.0, 10.0]) == pytest.approx([200.0, 100.0, 0.0])
    assert Scale(3.0, 3.0, 0.0, 50.0).at([3.0]).tolist() == [0.0]


@settings(deadline=None, derandomize=True)
@given(st.lists(st.floats(allow_nan=False), min_size=1, max_size=5), st.booleans())
def test_no_value_leaves_what_a_browser_can_draw(values: list[float], log: bool) -> None:
    at = Scale(0.5, 2.0, 50.0, 300.0, log=log).at(values)
    assert (abs(at) <= 20_000.0).all()
    assert all(a <= b for a, b in pairwise(Scale(0.5, 2.0, 50.0, 300.0, log=log).at(sorted(values)).tolist()))


def test_what_stands_inside_a_plot_is_cut_at_its_edges() -> None:
    sheet = Sheet(200.0)
    plot = Plot(sheet, 40.0, 20.0, 300.0, 150.0, x=(0.0, 3.0), y=(0.0, 1.0))
    plot.bottom_axis((0.0, 1.0), ("none", "<one>"), grid=True)
    plot.left_axis((0.5,), ("half",))
    plot.line([0.0, 9.0], [0.0, 9.0], "red", width=2.5)
    root = drawn(sheet)
    window = root.find("clipPath/rect")
    assert window is not None
    assert [window.get(side) for side in ("x", "y", "width", "height")] == ["40", "20", "300", "150"]
    inside = next(element for element in root if "clip-path" in element.attrib)
    assert [element.get("style") for element in inside] == [
        "fill:none;stroke:red;stroke-width:2.5;stroke-linecap:square"
    ]
    labels = {element.text: (element.get("x"), element.get("y")) for element in root.iter("text")}
    assert labels == {"none": ("40", "187.2"), "<one>": ("140", "187.2"), "half": ("32.5", "99.8")}


def test_an_empty_plot_has_nothing_to_cut() -> None:
    sheet = Sheet(200.0)
    Plot(sheet, 40.0, 20.0, 300.0, 150.0, x=(0.0, 1.0), y=(0.0, 1.0)).bottom_axis()
    assert [element.tag for element in drawn(sheet)] == ["title", "desc", "path"]


def test_a_key_goes_on_in_a_second_row() -> None:
    entries = [KeyEntry("a name as long as a line " * 2, "red"), KeyEntry("another name", "red", ring=True)]
    sheet = Sheet(100.0)
    sheet.key(entries)
    assert [element.get("y") for element in drawn(sheet).iter("text")] == ["14", "31"]
    assert Sheet.key_height(entries) == 34.0
    assert Sheet.key_height(entries[:1]) == 17.0


def test_a_group_of_the_calibration_figure_stands_where_it_should() -> None:
    """A plot of 318 units from 0 to 1.06 x 0.5: a tenth is 60 units."""
    group = CalibrationGroup(predicted=0.2, observed=0.3, lower=0.1, upper=0.5, records=50, events=15)
    root = ElementTree.fromstring(svg(CalibrationFigure("c", "T", "A", (group,)), "f"))
    window = root.find("clipPath/rect")
    ring = [element for element in root.iter("circle") if "--second" in element.get("style", "")][-1]
    assert window is not None
    bottom = float(window.get("y", "nan")) + 318.0
    assert (ring.get("cx"), ring.get("cy")) == ("168", number(bottom - 180.0))
    bar = styled(root, "stroke-width:1.6")[0]
    assert points(bar.get("d")) == [(168.0, bottom - 60.0), (168.0, bottom - 300.0)]


def test_the_receiver_operating_curve_goes_from_corner_to_corner() -> None:
    root = ElementTree.fromstring(svg(StepFigure("r", "T", "A", ((0.0, 0.0), (0.25, 0.75), (1.0, 1.0)), 0.75), "f"))
    curve = styled(root, "stroke-width:2.2")[0]
    assert points(curve.get("d")) == [(48.0, 342.0), (126.0, 108.0), (360.0, 30.0)]


def test_a_curve_crosses_one_at_its_reference() -> None:
    figure = CurveFigure(
        "c", "T", "A", "x", (0.0, 5.0, 10.0), (0.5, 1.0, 2.0), (0.4, 1.0, 1.0), (0.8, 1.0, 4.0), (0.5, 1.0, 2.0), 5.0
    )
    root = ElementTree.fromstring(svg(figure, "f"))
    middle = points(styled(root, "stroke-width:2.4")[0].get("d"))[1]
    ring = list(root.iter("circle"))[-1]
    assert (float(ring.get("cx", "nan")), float(ring.get("cy", "nan"))) == middle
    lowest, _, highest = points(styled(root, "stroke-width:2.4")[0].get("d"))
    assert lowest[1] - middle[1] == pytest.approx(middle[1] - highest[1], abs=0.11), "one half lies as far off as two"


def test_endless_limits_of_a_curve_are_drawn_to_the_edge() -> None:
    figure = CurveFigure("c", "T", "A", "x", (0.0, 1.0), (1.0, 1e200), (0.0, 0.0), (1.0, math.inf), (1.0, 2.0), 0.0)
    for element in ElementTree.fromstring(svg(figure, "f")).iter("path"):
        assert all(abs(float(value)) <= 20_000 for value in NUMBER.findall(element.get("d", "")))
        assert not re.search("nan|inf", element.get("d", ""))


def test_steps_of_a_histogram_are_shares_of_each_group() -> None:
    """The highest share is a half of its group; the axis reaches 1.08 times that over 220 units."""
    figure = HistogramFigure("h", "T", "A", "x", (0.0, 1.0, 2.0), (("a", (10, 10)), ("b", (3, 9))))
    root = ElementTree.fromstring(svg(figure, "f"))
    first, second = (points(element.get("d")) for element in styled(root, "stroke-width:1.8"))
    bottom = first[0][1]
    assert [round((bottom - y) / 220.0 * 0.75 * 1.08, 3) for _, y in first] == [0.0, 0.5, 0.5, 0.5, 0.5, 0.0]
    assert [round((bottom - y) / 220.0 * 0.75 * 1.08, 2) for _, y in second] == [0.0, 0.25, 0.25, 0.75, 0.75, 0.0]
    assert [x for x, _ in first] == [46.0, 46.0, 207.0, 207.0, 368.0, 368.0]


def test_dots_on_one_spot_are_drawn_once_and_larger_ones_are_larger() -> None:
    x = (0.0, 0.0, 1.0, 1.0)
    figure = ScatterFigure("s", "T", "A", "x", "y", x, x, (1.0, 1.0, 1.0, 400.0), (1, 1, 1, 400), lines=(0.5,))
    dots = styled(ElementTree.fromstring(svg(figure, "f")), "stroke-linecap:round")
    assert [element.get("d", "").count("h0") for element in dots] == [2, 1]
    assert ["stroke-width:3;" in element.get("style", "") for element in dots] == [True, False]


def test_every_position_is_a_number(sample: ModuleType) -> None:
    kinds = (sample.estimates_figure("a"), sample.calibration_figure(), sample.curve_figure(), sample.scatter_figure())
    for figure in kinds:
        for element in ElementTree.fromstring(svg(figure, "f")).iter():
            for name in ("x", "y", "cx", "cy"):
                assert math.isfinite(float(element.get(name, "0")))
            assert not re.sub(r"[MLHVhvz\s]", "", NUMBER.sub("", element.get("d", "")))
