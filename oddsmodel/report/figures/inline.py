"""Make an SVG fit to stand inside a page: own ids, the page's colours and font, a text alternative, few bytes."""

from __future__ import annotations

import re
from xml.etree import ElementTree

from oddsmodel.report.figures.canvas import VARIABLES
from oddsmodel.wording.plain import plain

_NUMBER = re.compile(r"-?\d+\.\d{2,}(?:e-?\d+)?")
_FONT = re.compile(r"font: (?:(bold|\d{3}) )?(?:italic )?([\d.]+)px [^;]*")
_REFERENCE = re.compile(r"url\(#([^)]+)\)")
_DOT = re.compile(r"M (\S+ \S+) L \1(?: |$)")
_GEOMETRY = ("d", "transform", "x", "y", "width", "height", "viewBox", "points", "cx", "cy", "r")


def inline_svg(source: str, *, prefix: str, title: str, alt: str) -> str:
    """The SVG as an inline element of a page.

    `prefix` makes every id of the drawing unique in the page. `title` and `alt` become its name and description.
    """
    root = ElementTree.fromstring(source)
    for element in root.iter():
        element.tag = element.tag.rpartition("}")[2]
        for name in [name for name in element.attrib if name.startswith("{")]:
            element.attrib[name.rpartition("}")[2]] = element.attrib.pop(name)
    _drop(root)
    _rename(root, prefix)
    for element in root.iter():
        _shorten(element)
    _flatten(root)

    box = root.get("viewBox", "0 0 400 300")
    root.attrib.clear()
    root.attrib.update(
        {
            "viewBox": box,
            "role": "img",
            "aria-labelledby": f"{prefix}-title {prefix}-desc",
            "class": "drawing",
            "focusable": "false",
        }
    )
    for name, words in (("desc", alt), ("title", title)):
        element = ElementTree.Element(name, {"id": f"{prefix}-{name}"})
        element.text = plain(words)
        root.insert(0, element)
    return ElementTree.tostring(root, encoding="unicode", short_empty_elements=True)


def _drop(root: ElementTree.Element) -> None:
    """Without metadata and the style sheet that would reach the whole page."""
    for parent in list(root.iter()):
        for child in list(parent):
            if child.tag in ("metadata", "style"):
                parent.remove(child)


def _rename(root: ElementTree.Element, prefix: str) -> None:
    """Only ids that something refers to, numbered in the order they are met."""
    wanted: dict[str, str] = {}
    for element in root.iter():
        for value in element.attrib.values():
            found = _REFERENCE.findall(value) + ([value[1:]] if value.startswith("#") else [])
            for name in found:
                wanted.setdefault(name, f"{prefix}-{len(wanted)}")
    for element in root.iter():
        for name, value in list(element.attrib.items()):
            if name == "id":
                if value in wanted:
                    element.set("id", wanted[value])
                else:
                    del element.attrib["id"]
            elif value.startswith("#"):
                element.set(name, f"#{wanted[value[1:]]}")
            elif "url(#" in value:
                element.set(name, _REFERENCE.sub(lambda found: f"url(#{wanted[found[1]]})", value))


def _shorten(element: ElementTree.Element) -> None:
    for name in _GEOMETRY:
        if name in element.attrib:
            element.set(name, " ".join(_NUMBER.sub(_rounded, element.attrib[name]).split()))
    if element.tag == "path":
        element.set("d", _DOT.sub(r"M\1h0", element.get("d", "")))
    if element.get("transform", "").startswith(("rotate(-0 ", "rotate(0 ")):
        del element.attrib["transform"]
    style = element.get("style")
    if style is None:
        return
    for stand_in, variable in VARIABLES.items():
        style = style.replace(stand_in, variable)
    style = _FONT.sub(_font, style)
    element.set("style", style.replace(": ", ":").replace("; ", ";"))


def _rounded(found: re.Match[str]) -> str:
    return f"{float(found[0]):.1f}".removesuffix(".0")


def _font(found: re.Match[str]) -> str:
    weight = f"font-weight:{found[1]};" if found[1] else ""
    return f"{weight}font-size:{float(found[2]):g}px"


def _flatten(parent: ElementTree.Element) -> None:
    """Groups that carry nothing give way to what they hold."""
    flat: list[ElementTree.Element] = []
    for child in list(parent):
        _flatten(child)
        child.tail = None
        if child.tag == "g" and not child.attrib:
            flat.extend(child)
        elif not (child.tag in ("g", "defs") and len(child) == 0):
            flat.append(child)
    parent[:] = flat
    if parent.tag not in ("text", "title", "desc"):
        parent.text = None
