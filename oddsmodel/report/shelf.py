"""The index of the reports in a folder: one HTML file with relative links, in the look of the report."""

from __future__ import annotations

import os
from dataclasses import dataclass
from pathlib import Path
from urllib.parse import quote

from oddsmodel.export.page import mark
from oddsmodel.export.shelf import Shelf, ShelfEntry
from oddsmodel.report.environment import environment

COMMAND = "shelf"


@dataclass(frozen=True, slots=True)
class EntryView:
    """place: the folder of the report, as it is called on the way from the index."""

    entry: ShelfEntry
    link: str
    place: str


def render_shelf(shelf: Shelf, folder: Path) -> str:
    """The index as the text of an HTML file that is to stand in `folder`."""
    view = {
        "generator": mark(COMMAND),
        "internal": shelf.internal,
        "entries": [
            EntryView(entry, _link(entry.report, folder), _way(entry.folder, folder)) for entry in shelf.entries
        ],
        "left_out": shelf.left_out,
    }
    return environment().get_template("shelf.html").render(view)


def _link(report: Path | None, folder: Path) -> str:
    """The way to a report as a relative address; every character that could mean something there is escaped."""
    if report is None:
        return ""
    return "/".join(quote(os.fsencode(part), safe="") for part in _way(report, folder).split(os.sep))


def _way(place: Path, folder: Path) -> str:
    return os.path.relpath(place.resolve(), folder.resolve())
