"""Who was counted, and who they were."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.report.view.sheet import FigureView, Sheets
from oddsmodel.report.view.tables import TableView
from oddsmodel.results.figures import FlowFigure
from oddsmodel.results.study import ModelResult, StudyResults
from oddsmodel.wording import say

ABOUT_ADJUSTMENT = ("noncollapsibility", "adjustment-in-a-trial")
"""Codes of the notes that stand beside the crude and adjusted estimates."""


@dataclass(frozen=True, slots=True)
class CountedView:
    flow: FigureView | None
    notes: tuple[str, ...]
    derived: tuple[TableView, ...] = ()
    derived_summary: str = ""


def counted(study: StudyResults, lead: ModelResult | None, sheets: Sheets) -> CountedView:
    """The flow of the model that answers, and what was noted on the records and on the model."""
    figures = lead.figures if lead is not None else ()
    flow = next((figure for figure in figures if isinstance(figure, FlowFigure)), None)
    of_model = [one for one in lead.findings if one.code not in ABOUT_ADJUSTMENT] if lead is not None else []
    found = [*study.findings, *of_model]
    return CountedView(
        flow=sheets.figure(flow) if flow is not None else None,
        notes=tuple(dict.fromkeys([*(one.message for one in found if one.severity == "note"), *study.notes])),
        derived=sheets.tables(table for one in study.derived for table in one.tables),
        derived_summary=say("fold-derived", labels=[one.label for one in study.derived]) if study.derived else "",
    )


def characteristics(study: StudyResults, sheets: Sheets) -> TableView | None:
    return sheets.table(study.characteristics) if study.characteristics is not None else None
