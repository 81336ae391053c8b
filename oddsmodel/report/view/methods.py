"""How it was done: a paragraph that could go into a paper, citing only the methods that were used."""

from __future__ import annotations

from dataclasses import dataclass

from oddsmodel.report.view.lead import exposures_shown, has_profile, is_estimated
from oddsmodel.results.study import DisclosedResults, ModelResult, StudyResults
from oddsmodel.wording import numbers, say
from oddsmodel.wording.report_answer import CASE_CONTROL, outcome_words
from oddsmodel.wording.report_methods import REFERENCES, WAYS


@dataclass(frozen=True, slots=True)
class MethodsView:
    paragraph: tuple[str, ...]
    formulas: tuple[tuple[str, str], ...]
    references: tuple[str, ...]


def methods(disclosed: DisclosedResults, lead: ModelResult | None) -> MethodsView:
    study = disclosed.study
    sentences: list[str] = []
    cited: set[str] = set()

    def tell(code: str, *references: str, **facts: object) -> None:
        sentences.append(say(code, **facts))
        cited.update(references)

    flow = lead.flow if lead is not None else None
    tell(
        "methods-records",
        design=study.design,
        read=study.records.read,
        analysed=flow.analysed if flow is not None else None,
        events=lead.events if lead is not None else None,
    )
    tell("methods-complete-records")
    if lead is not None:
        _model(study, lead, tell)
    _described(study, lead, tell)
    if disclosed.audience == "shareable" and disclosed.hide_counts_below > 0:
        tell("methods-disclosure", below=disclosed.hide_counts_below)
    versions = study.provenance.versions
    named = [f"{name} {versions[name]}" for name in ("oddsmodel", "Python") if name in versions]
    if named:
        tell("methods-software", versions=numbers.listed(named))
    return MethodsView(
        paragraph=tuple(sentences),
        formulas=tuple((model.name, model.formula) for model in study.models),
        references=tuple(REFERENCES[code] for code in sorted(cited)),
    )
