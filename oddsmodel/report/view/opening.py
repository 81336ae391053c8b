"""The opening: the question, the answer in words, and one picture."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.findings import Finding
from oddsmodel.report.view.lead import exposures_shown, is_estimated, lead_interval
from oddsmodel.report.view.sheet import FigureView, Sheets
from oddsmodel.results.figures import EstimatesFigure
from oddsmodel.results.study import CoefficientResult, ModelResult, StudyResults
from oddsmodel.wording import numbers, say
from oddsmodel.wording.report_answer import CASE_CONTROL, outcome_words

MOST_ANSWERS = 4
MOST_WARNINGS = 4


@dataclass(frozen=True, slots=True)
class AnswerView:
    """One contrast: its label, its odds ratio, and two sentences."""

    label: str
    odds_ratio: str
    measure: str
    sentence: str
    compatible: str


@dataclass(frozen=True, slots=True)
class OpeningView:
    title: str
    question: str
    answers: tuple[AnswerView, ...]
    more: str
    basis: str
    sampling: str
    picture: FigureView | None
    stops: tuple[Finding, ...]
    warnings: tuple[Finding, ...]
    further_warnings: tuple[Finding, ...]


def opening(study: StudyResults, lead: ModelResult | None, sheets: Sheets) -> OpeningView:
    more, basis, picture = "", "", None
    if lead is not None and is_estimated(lead):
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
        stops=tuple(one for one in found if one.severity == "stop"),
        warnings=cautions[:MOST_WARNINGS],
        further_warnings=cautions[MOST_WARNINGS:],
    )


def answers(study: StudyResults, lead: ModelResult | None) -> tuple[AnswerView, ...]:
    """One answer a contrast of the exposure, the first few; or why there is none."""
    if lead is None:
        return (AnswerView("", "", "", say("answer-no-model"), ""),)
    if not is_estimated(lead):
        return (AnswerView("", "", "", say("answer-not-estimated", name=lead.name), ""),)
    return tuple(_answer(study, lead, one) for one in exposures_shown(lead)[:MOST_ANSWERS]) + _several_columns(lead)


def _answer(study: StudyResults, model: ModelResult, one: CoefficientResult) -> AnswerView:
    limits = lead_interval(model, one)
    if one.odds_ratio is None:
        reason = one.reasons.get("odds_ratio", say("answer-no-reason"))
        return AnswerView(one.label, "", "", say("answer-no-estimate", reason=reason), "")
    adjusted = bool(model.adjustment) or len(model.exposures) > 1
    sentence = say(
        "answer",
        design=study.design,
        outcome=outcome_words(study.outcome_label, study.event),
        level=one.level,
        reference=one.reference,
        odds_ratio=one.odds_ratio,
        lower=limits.lower,
        upper=limits.upper,
        percent=say("level", level=model.level),
        adjusted=adjusted,
    )
    return AnswerView(
        label=one.label,
        odds_ratio=numbers.ratio(one.odds_ratio),
        measure=say("measure-adjusted" if adjusted else "measure-unadjusted"),
        sentence=sentence,
        compatible=say("compatible", lower=limits.lower, upper=limits.upper),
    )


def _several_columns(model: ModelResult) -> tuple[AnswerView, ...]:
    """One answer for all exposures whose columns mean nothing alone."""
    hidden = [one for one in model.coefficients if one.role == "exposure" and not one.shown]
    if not hidden:
        return ()
    labels = numbers.listed(list(dict.fromkeys(one.term for one in hidden)))
    joint = next((term for term in model.terms if term.term == "all exposure columns"), None)
    p = numbers.p_value(joint.p) if joint is not None and joint.p is not None else ""
    return (AnswerView(labels, "", "", say("answer-several-columns", labels=labels, p=p), ""),)


def serious(study: StudyResults, lead: ModelResult | None) -> tuple[Finding, ...]:
    """What must be read with the numbers: every caution and stop of the study, of the model and of its checks, once."""
    found = [*study.findings]
    if lead is not None:
        found += [*lead.findings, *(one for check in lead.checks for one in check.findings)]
    kept = {(one.code, one.message): one for one in found if one.severity != "note"}
    return tuple(kept.values())
