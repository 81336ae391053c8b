"""The answer to the study's question in words: a sentence a contrast of the exposure, or why there is none."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.results.lead import companion, exposures_shown, is_told, lead_interval
from oddsmodel.results.study import CoefficientResult, ModelResult, StudyResults
from oddsmodel.wording import numbers, say
from oddsmodel.wording.report_answer import outcome_words

MOST_ANSWERS = 4


@dataclass(frozen=True, slots=True)
class Answer:
    """One contrast: its label, its odds ratio, and two sentences; `beside`: what a model added by the program says."""

    label: str
    odds_ratio: str
    measure: str
    sentence: str
    compatible: str
    beside: str = ""


def answers(study: StudyResults, lead: ModelResult | None) -> tuple[Answer, ...]:
    """One answer a contrast of the exposure, the first few; or why there is none."""
    if lead is None:
        return (Answer("", "", "", say("answer-no-model"), ""),)
    if not is_told(lead):
        return (Answer("", "", "", say("answer-not-estimated", name=lead.name), ""),)
    return tuple(_answer(study, lead, one) for one in exposures_shown(lead)[:MOST_ANSWERS]) + _several_columns(lead)


def _answer(study: StudyResults, model: ModelResult, one: CoefficientResult) -> Answer:
    limits = lead_interval(model, one)
    beside = _beside(study, model, one) if one.odds_ratio is None else ""
    if one.odds_ratio is None and limits.lower is None and limits.upper is None:
        reason = one.reasons.get("odds_ratio", say("answer-no-reason"))
        return Answer(one.label, "", "", say("answer-no-estimate", reason=reason), "", beside)
    adjusted = bool(model.adjustment) or len(model.exposures) > 1
    facts = {
        "design": study.design,
        "outcome": outcome_words(study.outcome_label, study.event),
        "level": one.level,
        "reference": one.reference,
        "lower": limits.lower,
        "upper": limits.upper,
        "percent": say("level", level=model.level),
        "adjusted": adjusted,
    }
    finite = one.odds_ratio is not None
    measure = say("measure-adjusted" if adjusted else "measure-unadjusted")
    return Answer(
        label=one.label,
        odds_ratio=numbers.ratio(one.odds_ratio) if one.odds_ratio is not None else say("at-limit", **facts),
        measure=measure if finite else say("measure-no-finite", measure=measure),
        sentence=say("answer", odds_ratio=one.odds_ratio, **facts)
        if finite
        else say("answer-no-finite", median=one.exact.median_unbiased if one.exact is not None else None, **facts),
        compatible=say("compatible", lower=limits.lower, upper=limits.upper),
        beside=beside,
    )


def _beside(study: StudyResults, model: ModelResult, one: CoefficientResult) -> str:
    """What the model added by the program says of the same contrast."""
    added = companion(study, model)
    same = next((other for other in exposures_shown(added) if other.label == one.label), None) if added else None
    if added is None or same is None or same.odds_ratio is None:
        return ""
    limits = lead_interval(added, same)
    percent = say("level", level=added.level)
    return say("answer-beside", odds_ratio=same.odds_ratio, lower=limits.lower, upper=limits.upper, percent=percent)


def _several_columns(model: ModelResult) -> tuple[Answer, ...]:
    """One answer for all exposures whose columns mean nothing alone."""
    hidden = [one for one in model.coefficients if one.role == "exposure" and not one.shown]
    if not hidden:
        return ()
    labels = numbers.listed(list(dict.fromkeys(one.term for one in hidden)))
    joint = next((term for term in model.terms if term.term == "all exposure columns"), None)
    p = numbers.p_value(joint.p) if joint is not None and joint.p is not None else ""
    return (Answer(labels, "", "", say("answer-several-columns", labels=labels, p=p), ""),)
