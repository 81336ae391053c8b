"""The short form of a report for a notebook cell: the answer in words and the exposures' table."""

from __future__ import annotations

from oddsmodel.export.answer import answers
from oddsmodel.progress import Silent
from oddsmodel.report.environment import environment
from oddsmodel.report.view.models import exposures_table
from oddsmodel.report.view.opening import serious
from oddsmodel.report.view.sheet import Sheets
from oddsmodel.results.lead import is_told, lead_model
from oddsmodel.results.study import DisclosedResults


def notebook_summary(disclosed: DisclosedResults) -> str:
    """An HTML fragment with its own narrow styles; it loads nothing and runs nothing."""
    study = disclosed.study
    lead = lead_model(study)
    sheets = Sheets(disclosed.hide_counts_below, Silent())
    table = exposures_table(lead) if lead is not None and is_told(lead) else None
    view = {
        "title": study.title,
        "answers": answers(study, lead),
        "table": sheets.table(table) if table is not None else None,
        "findings": serious(study, lead),
    }
    return environment().get_template("notebook.html").render(view)
