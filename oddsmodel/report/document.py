"""The report: one HTML file that loads nothing from outside and works with scripts off."""

from __future__ import annotations

from typing import Any

from oddsmodel.progress import Progress, Silent
from oddsmodel.report.environment import environment
from oddsmodel.report.view.cause import cause, closing_cautions
from oddsmodel.report.view.checks import checks
from oddsmodel.report.view.counted import characteristics, counted
from oddsmodel.report.view.methods import methods
from oddsmodel.report.view.models import comparison, crude, estimates, not_estimated, other_models
from oddsmodel.report.view.opening import opening
from oddsmodel.report.view.sheet import Sheets
from oddsmodel.results.lead import is_told, lead_model
from oddsmodel.results.study import DisclosedResults, StudyResults


def render_report(disclosed: DisclosedResults, progress: Progress | None = None) -> str:
    """The whole report as the text of an HTML file; the same results give the same text."""
    progress = progress or Silent()
    study = disclosed.study
    progress.stage("drawing", number_of_figures(study))
    sheets = Sheets(disclosed.hide_counts_below, progress)
    lead = lead_model(study)
    answered = lead if lead is not None and is_told(lead) else None

    # In the order of the page: figures and tables take their numbers as they are asked for.
    view: dict[str, Any] = {
        "internal": disclosed.audience == "internal",
        "opening": opening(study, lead, sheets),
        "crude": crude(answered, sheets) if answered is not None else None,
        "counted": counted(study, lead, sheets),
        "characteristics": characteristics(study, sheets),
        "estimates": estimates(answered, sheets) if answered is not None else None,
        "comparison": comparison(study, sheets),
        "other_models": other_models(study, lead, sheets),
        "not_estimated": not_estimated(study, lead, sheets),
        "checks": checks(answered, sheets) if answered is not None else None,
        "methods": methods(disclosed, lead),
        "cause": cause(study, lead, sheets),
        "cautions": closing_cautions(study),
        "records": study.records,
        "provenance": study.provenance,
    }
    return environment().get_template("report.html").render(view)


def number_of_figures(study: StudyResults) -> int:
    """How many figures there are to draw, at most."""
    of_models = sum(len(model.figures) + sum(len(check.figures) for check in model.checks) for model in study.models)
    return of_models + (study.comparison_figure is not None)
