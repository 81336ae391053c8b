"""The page of results set side by side: one HTML file that loads nothing, in the look of the report."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.export.page import mark
from oddsmodel.progress import Progress, Silent
from oddsmodel.report.environment import environment
from oddsmodel.report.view.sheet import FigureView, Sheets
from oddsmodel.report.view.tables import TableView
from oddsmodel.results.changes import Changes, ModelChanges

COMMAND = "changes"


@dataclass(frozen=True, slots=True)
class SeriesView:
    name: str
    picture: FigureView | None
    table: TableView | None
    notes: tuple[str, ...]


def render_changes(changes: Changes, progress: Progress | None = None) -> str:
    """The whole page as the text of an HTML file; the same comparison gives the same text."""
    progress = progress or Silent()
    progress.stage("drawing", sum(model.figure is not None for model in changes.models))
    sheets = Sheets(changes.threshold, progress)
    series = [_series(model, sheets) for model in changes.models]
    view = {
        "generator": mark(COMMAND),
        "changes": changes,
        "first": series[0] if series else None,
        "others": series[1:],
        "counts": sheets.table(changes.counts),
    }
    return environment().get_template("changes.html").render(view)


def _series(model: ModelChanges, sheets: Sheets) -> SeriesView:
    return SeriesView(
        name=model.name,
        picture=sheets.figure(model.figure) if model.figure is not None else None,
        table=sheets.table(model.table) if model.table is not None else None,
        notes=model.notes,
    )
