"""results.json: every answer as plain JSON, described by the schema beside this file."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from dataclasses import asdict
from importlib.resources import files
from typing import Any

from oddsmodel.export.answer import answers
from oddsmodel.findings import Finding
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.results.lead import lead_model
from oddsmodel.results.study import (
    CheckResult,
    CoefficientResult,
    CrudeEstimate,
    DisclosedResults,
    Exclusion,
    ModelResult,
    TermTest,
    TrendResult,
)
from oddsmodel.results.tables import Hidden, Table
from oddsmodel.wording import say

SCHEMA_VERSION = "1.2"
ESTIMATES = ("log_odds_ratio", "standard_error", "odds_ratio")


def results_text(disclosed: DisclosedResults) -> str:
    """The text of results.json. A number that is not finite is a ValueError: every missing number must be None."""
    return json.dumps(results_document(disclosed), ensure_ascii=False, allow_nan=False, indent=1) + "\n"


def results_schema() -> dict[str, Any]:
    """The JSON Schema (draft 2020-12) of results.json. Later minor versions add keys; no key is taken away."""
    text = files("oddsmodel.export").joinpath("schema", "results-1.0.json").read_text("utf-8")
    schema: dict[str, Any] = json.loads(text)
    return schema


def results_document(disclosed: DisclosedResults) -> dict[str, Any]:
    """Results as they may leave, as plain JSON values in a fixed order of keys.

    A number that is missing is None with a reason under its key in the nearest `reasons`; the number in a part of an
    object has its reason under "part.key", or under "part" for the whole of it.
    """
    study = disclosed.study
    reasons = {}
    if study.records.read is None:
        reasons["records.read"] = say("why-count-hidden", threshold=disclosed.hide_counts_below)
    return {
        "schema_version": SCHEMA_VERSION,
        "study": {
            "title": study.title,
            "question": study.question,
            "design": study.design,
            "aim": study.aim,
            "outcome": study.outcome,
            "event": study.event,
            "rules": list(study.rules),
            "answer": [
                {"label": one.label, "sentence": f"{one.sentence} {one.beside}".strip()}
                for one in answers(study, lead_model(study))
            ],
        },
        "disclosure": {
            "audience": disclosed.audience,
            "hide_counts_below": disclosed.hide_counts_below,
            "hidden_cells": disclosed.hidden_cells,
        },
        "records": {
            "read": _plain(study.records.read),
            "excluded": _exclusions(study.records.excluded),
            "sha256": study.records.sha256,
        },
        "models": [_model(model, disclosed) for model in study.models],
        "findings": [_finding(finding) for finding in study.findings],
        "provenance": {
            "plan": study.provenance.plan_name,
            "plan_sha256": study.provenance.plan_sha256,
            "versions": dict(study.provenance.versions),
            "seed": study.provenance.seed,
        },
        "plan": _plain(study.provenance.plan_facts),
        "columns": [
            {
                "name": column.name,
                "label": column.label,
                "kind": column.kind,
                "units": column.units,
                "per": _plain(column.per),
                "levels": list(column.levels),
                "reference": column.reference,
            }
            for column in study.columns
        ],
        "standard_deviations": [
            {"column": one.column, "label": one.label, "units": one.units, "value": _plain(one.value)}
            for one in study.standard_deviations
        ],
        "derived": [_derived(one, disclosed) for one in study.derived],
        "reasons": reasons,
    }


def _exclusions(excluded: tuple[Exclusion, ...]) -> list[dict[str, Any]]:
    return [{"code": one.code, "reason": one.reason, "records": _plain(one.records)} for one in excluded]


def _derived(column: DerivedColumn, disclosed: DisclosedResults) -> dict[str, Any]:
    cells = [cell for table in column.tables for row in table.rows for cell in row]
    hidden = any(isinstance(cell, Hidden) for cell in cells)
    return {
        "name": column.name,
        "label": column.label,
        "kind": column.kind,
        "rule": column.rule,
        "told": column.told,
        "sources": list(column.sources),
        "cut_points": [_plain(cut) for cut in column.cut_points],
        "tables": [_table(table) for table in column.tables],
        "reasons": {"tables": say("why-count-hidden", threshold=disclosed.hide_counts_below)} if hidden else {},
    }


def _table(table: Table) -> dict[str, Any]:
    """A table of text and numbers; a hidden cell is None."""
    return {
        "columns": [{"key": column.key, "heading": column.heading} for column in table.columns],
        "rows": [[None if isinstance(cell, Hidden) else _plain(cell) for cell in row] for row in table.rows],
    }


def _model(model: ModelResult, disclosed: DisclosedResults) -> dict[str, Any]:
    document: dict[str, Any] = {
        "id": model.id,
        "name": model.name,
        "formula": model.formula,
        "method": model.method,
        "added_by_program": model.added_by_program,
        "variant": dict(model.variant),
        "role": model.role,
        "why": model.why,
        "level": model.level,
        "status": model.status,
        "exposures": list(model.exposures),
        "adjustment": list(model.adjustment),
        "left_out": _exclusions(model.flow.left_out),
        "records": _plain(model.records),
        "events": _plain(model.events),
        "patterns": _plain(model.patterns),
        "parameters": _plain(model.parameters),
        "log_likelihood": _plain(model.log_likelihood),
        "null_log_likelihood": _plain(model.null_log_likelihood),
        "coefficients": [_coefficient(one) for one in model.coefficients],
        "terms": [_test(one) for one in model.terms],
        "checks": {check.name: _check(check) for check in model.checks},
        "certificate": {
            "digits": _plain(model.certificate.digits),
            "condition_number": _plain(model.certificate.condition_number),
        },
        "findings": [_finding(finding) for finding in _all_findings(model)],
        "based_on": model.based_on,
        "differs": model.differs,
        "planned": model.planned,
        "trends": [_trend(one) for one in model.trends],
        "averages": [_coefficient(one) for one in model.averages],
        **({} if model.groups is None else {"groups": model.groups, "grouped_by": model.grouped_by}),
    }
    numbers = ("records", "events", "patterns", "log_likelihood", "null_log_likelihood")
    missing = [name for name in numbers if document[name] is None]
    missing += [f"certificate.{name}" for name, value in document["certificate"].items() if value is None]
    document["reasons"] = _complete(model.reasons, missing)
    return document


def _test(one: TermTest) -> dict[str, Any]:
    missing = [name for name in ("likelihood_ratio", "p") if getattr(one, name) is None]
    return {
        "term": one.term,
        "df": _plain(one.df),
        "likelihood_ratio": _plain(one.likelihood_ratio),
        "p": _plain(one.p),
        **({} if one.wald is None else {"wald": asdict(one.wald)}),
        "reasons": dict.fromkeys(missing, one.reason or say("number-not-available")),
    }


def _trend(one: TrendResult) -> dict[str, Any]:
    return {
        "column": one.column,
        "term": one.term,
        "scores": [{"level": level, "score": _plain(score)} for level, score in one.scores],
        "step": None if one.step is None else _coefficient(one.step),
        "trend": _test(one.trend),
        "departure": _test(one.departure),
        "reasons": {"step": one.reason or say("number-not-available")} if one.step is None else {},
    }


def _all_findings(model: ModelResult) -> Iterator[Finding]:
    yield from model.findings
    for check in model.checks:
        yield from (finding for finding in check.findings if finding not in model.findings)


def _complete(reasons: Mapping[str, str], missing: list[str]) -> dict[str, str]:
    """Reasons with a plain one for each missing number that has none, of its own or of the part that it stands in."""
    found = dict(reasons)
    for name in missing:
        if name not in reasons and name.split(".")[0] not in reasons:
            found[name] = say("number-not-available")
    return found


def _coefficient(one: CoefficientResult) -> dict[str, Any]:
    shown = one.shown or one.role == "intercept"
    reasons = dict(one.reasons)
    if not shown:
        own = say("no-odds-ratio-of-its-own")
        reasons = dict.fromkeys(("odds_ratio", "wald.lower", "wald.upper", "profile"), own) | reasons
    document: dict[str, Any] = {
        "term": one.term,
        "level": one.level,
        "reference": one.reference,
        "levels": dict(one.levels) if one.levels is not None else None,
        "role": one.role,
        "label": one.label,
        "log_odds_ratio": _plain(one.log_odds_ratio),
        "standard_error": _plain(one.standard_error),
        "odds_ratio": _plain(one.odds_ratio) if shown else None,
        "wald": {
            "lower": _plain(one.wald.lower) if shown else None,
            "upper": _plain(one.wald.upper) if shown else None,
            "p": _plain(one.wald.p),
            "df": _plain(one.wald.df),
        },
        "profile": {
            "lower": _plain(one.profile.lower) if shown else None,
            "upper": _plain(one.profile.upper) if shown else None,
        },
        "crude": _crude(one.crude),
        "crude_all_records": None
        if one.crude_all_records is None
        else {"records": _plain(one.crude_all_records.records), "odds_ratio": _plain(one.crude_all_records.odds_ratio)},
    }
    if one.exact is not None:
        document["exact"] = {name: _plain(value) for name, value in asdict(one.exact).items()}
    missing = [name for name in ESTIMATES if document[name] is None]
    missing += [
        f"{part}.{name}"
        for part in ("wald", "profile", "crude", "crude_all_records", "exact")
        for name, value in (document.get(part) or {}).items()
        if value is None and name != "df"
    ]
    document["reasons"] = _complete(reasons, missing)
    return document


def _crude(crude: CrudeEstimate | None) -> dict[str, Any] | None:
    if crude is None:
        return None
    wald, profile = crude.wald, crude.profile
    return {
        "records": _plain(crude.records),
        "odds_ratio": _plain(crude.odds_ratio),
        "wald": None if wald is None else {"lower": _plain(wald.lower), "upper": _plain(wald.upper)},
        "profile": None if profile is None else {"lower": _plain(profile.lower), "upper": _plain(profile.upper)},
    }


def _check(check: CheckResult) -> dict[str, Any]:
    statistics = {name: _plain(value) for name, value in check.statistics.items()}
    missing = [name for name, value in statistics.items() if value is None]
    return statistics | {"verdict": check.verdict, "reasons": _complete(check.reasons, missing)}


def _finding(finding: Finding) -> dict[str, Any]:
    facts = {name: _plain(value) for name, value in finding.facts.items()}
    return {"severity": finding.severity, "code": finding.code, "facts": facts, "message": finding.message}


def _plain(value: Any) -> Any:
    """Numbers of array libraries as the plain numbers they are; lists and dictionaries likewise within."""
    if isinstance(value, Mapping):
        return {str(key): _plain(one) for key, one in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(one) for one in value]
    if value is None or isinstance(value, str | bool):
        return value
    if isinstance(value, int | float):
        return int(value) if isinstance(value, int) else float(value)
    return value.item()
