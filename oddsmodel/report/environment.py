"""How the templates are filled: everything escaped, nothing undefined, no control or direction marks from data."""

from __future__ import annotations

from functools import cache

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup, escape

from oddsmodel.wording import say
from oddsmodel.wording.plain import plain


@cache
def environment() -> Environment:
    """The templates of this package with autoescape on."""
    made = Environment(
        loader=PackageLoader("oddsmodel.report", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        finalize=_one_line,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    made.globals["say"] = say
    made.filters["lines"] = _several_lines
    return made


def _one_line(value: object) -> object:
    """Text without control or direction marks; markup, which is ours, as it is."""
    return plain(value) if isinstance(value, str) and not isinstance(value, Markup) else value


def _several_lines(text: str) -> Markup:
    """Text of several lines, each without control or direction marks, escaped here."""
    return escape("\n".join(plain(line.replace("\t", "    ")) for line in text.splitlines()))
