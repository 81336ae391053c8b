"""Lines, outlines and markers as SVG: coordinates to a tenth of a unit, styles in the page's colours."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import Literal

Dashes = tuple[float, ...]
"""Lengths of strokes and gaps in turn, in widths of the line; empty for a line without gaps."""
Shape = Literal["circle", "square", "diamond", "triangle"]
SHAPES: tuple[Shape, ...] = ("circle", "square", "diamond", "triangle")


def number(value: float) -> str:
    """A coordinate to a tenth, without needless digits."""
    return f"{round(value, 1) + 0.0:g}"


def path(x: Iterable[float], y: Iterable[float]) -> str:
    """The data of a path through the points."""
    return "M" + " ".join([f"{number(across)} {number(down)}" for across, down in zip(x, y, strict=True)])


def outline(x: Iterable[float], y: Iterable[float]) -> str:
    """The data of a closed path through the points."""
    return f"{path(x, y)}z"


def stroke(data: str, colour: str, width: float, dashes: Dashes = (), *, butt: bool = False) -> str:
    """A line along a path; its ends reach half its width beyond the points, but for dashes and where `butt`."""
    style = f"fill:none;stroke:{colour};stroke-width:{width:g}"
    if dashes:
        style += f";stroke-dasharray:{','.join(f'{length * width:g}' for length in dashes)}"
    elif not butt:
        style += ";stroke-linecap:square"
    return f'<path d="{data}" style="{style}"/>'


def wash(data: str, colour: str, opacity: float) -> str:
    """The inside of an outline in a thin wash of a colour."""
    return f'<path d="{data}" style="fill:{colour};opacity:{opacity:g}"/>'


def marker(x: float, y: float, shape: Shape, size: float, edge: str, fill: str, width: float) -> str:
    """A marker `size` units across about a position, whose edge has its own colour and width."""
    style = f"fill:{fill};stroke:{edge};stroke-width:{width:g}"
    half = size / 2
    corners: tuple[tuple[float, float], ...]
    match shape:
        case "circle":
            return f'<circle cx="{number(x)}" cy="{number(y)}" r="{half:g}" style="{style}"/>'
        case "square":
            corners = ((-half, half), (half, half), (half, -half), (-half, -half))
        case "diamond":
            reach = half * math.sqrt(2.0)
            corners = ((0.0, reach), (reach, 0.0), (0.0, -reach), (-reach, 0.0))
        case "triangle":
            corners = ((0.0, -half), (half, half), (-half, half))
    data = outline([x + across for across, _ in corners], [y + down for _, down in corners])
    return f'<path d="{data}" style="{style};stroke-linejoin:miter"/>'
