"""Hands out figures and tables in the order of the page, each with its number."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from markupsafe import Markup

from oddsmodel.progress import Progress
from oddsmodel.report.figures import svg
from oddsmodel.report.view.tables import TableView, table_view
from oddsmodel.results.figures import Figure
from oddsmodel.results.tables import Table


@dataclass(frozen=True, slots=True)
class FigureView:
    """`svg` is trusted markup: drawn by us, every text in it escaped."""

    id: str
    number: int
    title: str
    alt: str
    svg: Markup


class Sheets:
    """Draws figures and sets tables; the numbers follow the order in which they are asked for."""

    def __init__(self, hide_counts_below: int, progress: Progress) -> None:
        self._hide_counts_below = hide_counts_below
        self._progress = progress
        self._figures = 0
        self._tables = 0

    def figure(self, figure: Figure) -> FigureView:
        self._figures += 1
        id_ = f"figure-{self._figures}"
        drawn = Markup(svg(figure, id_))
        self._progress.advance()
        return FigureView(id_, self._figures, figure.title, figure.alt, drawn)

    def figures(self, figures: Iterable[Figure]) -> tuple[FigureView, ...]:
        return tuple(self.figure(figure) for figure in figures)

    def table(self, table: Table) -> TableView:
        self._tables += 1
        return table_view(table, self._tables, self._hide_counts_below)

    def tables(self, tables: Iterable[Table]) -> tuple[TableView, ...]:
        return tuple(self.table(table) for table in tables)
