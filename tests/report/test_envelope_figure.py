"""An envelope as drawn: points and band where they belong."""

from __future__ import annotations

import re
from xml.etree import ElementTree

from oddsmodel.report.figures import svg
from oddsmodel.results.figures import EnvelopeFigure


def test_points_stand_on_the_scales_and_the_band_around_the_mean() -> None:
    x, middle = (0.5, 1.0, 2.0), (0.4, 0.9, 2.1)
    lower, upper = (0.2, 0.6, 1.5), (0.6, 1.3, 3.0)
    figure = EnvelopeFigure(
        "h", "T", "A", "Expected", "Residual", x, (0.3, 1.0, 2.5), middle, lower, upper, (1,) * 3, (9,) * 3
    )
    root = ElementTree.fromstring(svg(figure, "f"))
    window = root.find("clipPath/rect")
    assert window is not None
    left, top, width, height = (float(window.get(key, "nan")) for key in ("x", "y", "width", "height"))
    circles = [one for one in root.iter("circle") if one.get("cx")]
    spots = [(float(one.get("cx", "nan")), float(one.get("cy", "nan"))) for one in circles][-3:]
    for (across, down), value, height_of in zip(spots, x, figure.observed, strict=True):
        assert abs(across - (left + width * value / (1.04 * 2.0))) < 0.1
        assert abs(down - (top + height * (1 - height_of / (1.04 * 3.0)))) < 0.1
    text = "".join(root.itertext())
    assert re.search("Expected.*", text)
    assert "simulations: mean, smallest and largest" in text
