"""The opening: the question, the answer in words, and one picture."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.export.answer import MOST_ANSWERS, Answer, answers
from oddsmodel.findings import Finding
from oddsmodel.report.view.sheet import FigureView, Sheets
from oddsmodel.results.figures import EstimatesFigure
from oddsmodel.results.lead import companion, exposures_shown, is_told
from oddsmodel.results.study import ModelResult, StudyResults
from oddsmodel.wording import say
from oddsmodel.wording.report_answer import CASE_CONTROL, outcome_words

MOST_WARNINGS = 4


@dataclass(frozen=True, slots=True)
class OpeningView:
    title: str
    question: str
    answers: tuple[Answer, ...]
    more: str
    basis: str
    sampling: str
    picture: FigureView | None
    beside: tuple[str, str] | None
    """Where in the page the model is that was added because this one has no finite answer, and its name."""
    stops: tuple[Finding, ...]
    warnings: tuple[Finding, ...]
    further_warnings: tuple[Finding, ...]


def opening(study: StudyResults, lead: ModelResult | None, sheets: Sheets) -> OpeningView:
    more, basis, picture = "", "", None
    beside = None
    if lead is not None and is_told(lead):
        added = companion(study, lead)
        beside = None if added is None else (f"model-{study.models.index(added) + 1}", added.name)
        number = len(exposures_shown(lead))
        more = say("answer-more", number=number) if number > MOST_ANSWERS else ""
        basis = say(
            "answer-basis",
            adjustment=list(lead.adjustment_labels),
            mutually=len(lead.exposures) > 1,
            records=lead.records,
            events=lead.events,
            design=study.design,
        )
        first = next((figure for figure in lead.figures if isinstance(figure, EstimatesFigure)), None)
        picture = sheets.figure(first) if first is not None and first.marks else None
    found = serious(study, lead)
    cautions = tuple(one for one in found if one.severity == "caution")
    outcome = outcome_words(study.outcome_label, study.event)
    return OpeningView(
        title=study.title,
        question=study.question,
        answers=answers(study, lead),
        more=more,
        basis=basis,
        sampling=say("answer-case-control", outcome=outcome) if study.design in CASE_CONTROL else "",
        picture=picture,
        beside=beside,
        stops=tuple(one for one in found if one.severity == "stop"),
        warnings=cautions[:MOST_WARNINGS],
        further_warnings=cautions[MOST_WARNINGS:],
    )


def serious(study: StudyResults, lead: ModelResult | None) -> tuple[Finding, ...]:
    """What must be read with the numbers: every caution and stop of the study, of the model and of its checks, once."""
    found = [*study.findings]
    if lead is not None:
        found += [*lead.findings, *(one for check in lead.checks for one in check.findings)]
    kept = {(one.code, one.message): one for one in found if one.severity != "note"}
    return tuple(kept.values())
