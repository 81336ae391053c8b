"""The picture of precision against recall, and the band of the calibration curve."""

from __future__ import annotations

import re
from xml.etree import ElementTree

from oddsmodel.report.figures import svg
from oddsmodel.results.figures import CalibrationFigure, PrecisionFigure


def paths(root: ElementTree.Element, style: str) -> list[list[tuple[float, float]]]:
    found = []
    for element in root.iter("path"):
        if style in element.get("style", ""):
            numbers = [float(text) for text in re.findall(r"-?\d+(?:\.\d+)?", element.get("d", ""))]
            found.append(list(zip(numbers[::2], numbers[1::2], strict=True)))
    return found


def test_points_stand_where_they_should_and_the_share_of_events_is_a_level() -> None:
    figure = PrecisionFigure("p", "T", "A", ((0.25, 0.75), (0.5, 0.5), (1.0, 0.25)), 0.456, 0.25)
    root = ElementTree.fromstring(svg(figure, "f"))
    (curve,) = paths(root, "stroke-width:2.2")
    window = root.find("clipPath/rect")
    assert window is not None
    left, top, side = (float(window.get(name, "nan")) for name in ("x", "y", "width"))
    assert [(round((x - left) / side, 3), round(1 - (y - top) / side, 3)) for x, y in curve] == list(figure.points)
    words = [element.text for element in root.iter("text")]
    assert "Average precision 0.456" in words
    assert "share of events, as by a coin’s toss" in words


def test_an_empty_curve_is_drawn_without_one() -> None:
    root = ElementTree.fromstring(svg(PrecisionFigure("p", "T", "A", (), 0.5, 0.1), "f"))
    assert paths(root, "stroke-width:2.2") == []


def test_the_band_is_washed_in_below_the_curve() -> None:
    points = ((0.1, 0.12), (0.5, 0.45))
    bare = svg(CalibrationFigure("c", "T", "A", (), points), "f")
    banded = svg(CalibrationFigure("c", "T", "A", (), points, ((0.1, 0.05, 0.2), (0.5, 0.4, 0.5))), "f")
    assert "opacity:.16" in banded or "opacity:0.16" in banded
    assert "opacity:.16" not in bare
    assert "opacity:0.16" not in bare
    assert "with its band" in banded
    assert "with its band" not in bare
