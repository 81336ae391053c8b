"""How it was done: a paragraph that could go into a paper, citing only the methods that were used."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from oddsmodel.report.view.models import method_beside
from oddsmodel.results.lead import EXACT, SEPARATED, companion, exposures_shown, has_profile, is_told
from oddsmodel.results.study import DisclosedResults, ModelResult, StudyResults
from oddsmodel.wording import numbers, say
from oddsmodel.wording.report_answer import CASE_CONTROL, outcome_words
from oddsmodel.wording.report_methods import METHOD_REFERENCES, REFERENCES, WAYS

Told = tuple[str, tuple[str, ...]]
"""A sentence and the references it cites."""


@dataclass(frozen=True, slots=True)
class MethodsView:
    paragraphs: tuple[str, ...]
    formulas: tuple[tuple[str, str, str], ...]
    """Name, formula, and method in words where the models differ in it."""
    references: tuple[str, ...]


def methods(disclosed: DisclosedResults, lead: ModelResult | None) -> MethodsView:
    study = disclosed.study
    parts = [list(_records(study, lead))]
    if lead is not None and is_told(lead):
        parts += [list(_model(study, lead)), list(_described(study, lead))]
    parts.append(list(_written(disclosed)))
    cited = sorted({reference for part in parts for _, references in part for reference in references})
    return MethodsView(
        paragraphs=tuple(" ".join(sentence for sentence, _ in part) for part in parts if part),
        formulas=tuple((model.name, model.formula, method_beside(study, model)) for model in study.models),
        references=tuple(REFERENCES[code] for code in cited),
    )


def _records(study: StudyResults, lead: ModelResult | None) -> Iterator[Told]:
    analysed, events = (lead.flow.analysed, lead.events) if lead is not None else (None, None)
    yield say("methods-records", design=study.design, read=study.records.read, analysed=analysed, events=events), ()
    yield from ((rule, ()) for rule in study.rules)
    yield say("methods-complete-records"), ()


def _model(study: StudyResults, lead: ModelResult) -> Iterator[Told]:
    facts = {
        "outcome": outcome_words(study.outcome_label, study.event),
        "method": lead.method,
        "exposures": list(lead.exposure_labels),
        "adjustment": list(lead.adjustment_labels),
    }
    yield say("methods-model", **facts), ("cox-1958", *METHOD_REFERENCES.get(lead.method, ()))
    if study.design in CASE_CONTROL:
        yield say("methods-case-control"), ("prentice-pyke-1979",)
    level = say("level", level=lead.level)
    if lead.groups is not None and lead.groups > 1:
        groups, column = lead.groups, lead.grouped_by
        told = say("methods-grouped", groups=groups, df=groups - 1, column=column, level=level)
        yield told, ("cameron-miller-2015", "liang-zeger-1986", "wald-1943")
    elif lead.status == SEPARATED:
        yield from _separated(study, lead, level)
    elif lead.method == EXACT:
        yield say("methods-exact", level=level), ()
    elif lead.method == "penalised":
        yield say("methods-profile-penalised", level=level), ("heinze-schemper-2002", "wald-1943")
    elif lead.method == "log-F":
        prior = next((one.facts for one in lead.findings if one.code == "prior-in-words"), None)
        told = say("methods-profile-prior", level=level, prior=prior)
        yield told, ("greenland-mansournia-2015", "venzon-moolgavkar-1988", "wald-1943")
    elif has_profile(lead):
        yield say("methods-profile", level=level), ("venzon-moolgavkar-1988", "wald-1943")
    else:
        yield say("methods-wald", level=level), ("wald-1943",)
    if any(term.wald is not None for term in lead.terms):
        yield say("methods-grouped-terms"), ()
    if any(term.p is not None for term in lead.terms):
        yield say("methods-terms"), ()
    if any(one.crude is not None for one in exposures_shown(lead)):
        yield say("methods-crude"), ("greenland-1999",)
    if any(table.id == "corrected_intercept" for model in study.models for table in model.tables):
        yield say("methods-corrected-intercept"), ("puhr-2017",)
    if any(table.id.startswith("two_by_two") for table in lead.tables):
        yield say("methods-two-by-two"), ("woolf-1955", "breslow-day-1980")
    if lead.adjustment:
        yield say("methods-adjustment"), ("westreich-greenland-2013",)
    if study.standard_deviations:
        sizes = [
            (one.label, say("deviation-size", value=one.value, units=one.units or ""))
            for one in study.standard_deviations
        ]
        yield say("methods-standard-deviations", model=lead.name, deviations=sizes), ()
    if any(trend.trend.p is not None for model in study.models for trend in model.trends):
        yield say("methods-trends"), ("cochran-1954", "armitage-1955")
    if lead.averages:
        yield say("methods-averages"), ()
    others = [model.name for model in study.models if not model.added_by_program]
    if len(others) > 1:
        yield say("methods-several-models", number=len(others), names=others), ()
    for method in dict.fromkeys(model.method for model in study.models if not model.added_by_program):
        if method != lead.method:
            named = [model.name for model in study.models if model.method == method and not model.added_by_program]
            yield say("methods-other-method", method=method, names=named), METHOD_REFERENCES.get(method, ())


def _separated(study: StudyResults, lead: ModelResult, level: str) -> Iterator[Told]:
    """How separation was found, and what is told of a model that has no maximum."""
    yield say("methods-separated", level=level), ("albert-anderson-1984", "konis-2007", "santner-duffy-1986")
    if companion(study, lead) is not None:
        yield say("methods-penalised-beside", level=level), METHOD_REFERENCES["penalised"]


def _described(study: StudyResults, lead: ModelResult) -> Iterator[Told]:
    if study.characteristics is not None:
        yield say("methods-characteristics"), ("austin-2009",)
    done = [check.name for check in lead.checks if check.verdict != "not applicable"]
    ways = [WAYS[name] for name in dict.fromkeys(done) if name in WAYS]
    if ways:
        cited = tuple(reference for _, references in ways for reference in references)
        yield say("methods-checks", ways=[say(code) for code, _ in ways]), cited


def _written(disclosed: DisclosedResults) -> Iterator[Told]:
    if disclosed.audience == "shareable" and disclosed.hide_counts_below > 0:
        yield say("methods-disclosure", below=disclosed.hide_counts_below), ()
    versions = disclosed.study.provenance.versions
    named = [f"{name} {versions[name]}" for name in ("oddsmodel", "Python") if name in versions]
    if named:
        yield say("methods-software", versions=numbers.listed(named)), ()
