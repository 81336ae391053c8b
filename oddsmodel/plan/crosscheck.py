"""What must hold between the keys of a plan, before any record is read."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from oddsmodel.errors import Fault
from oddsmodel.plan.asked_checks import ASKED_CHECKS
from oddsmodel.plan.database import faults_of_database
from oddsmodel.plan.derived_checks import check_derived, check_renamed
from oddsmodel.plan.faults import fault, key_path
from oddsmodel.plan.later import LATER_DESIGN
from oddsmodel.plan.model_checks import check_column, check_models
from oddsmodel.plan.outcome_checks import check_outcome, check_repeats
from oddsmodel.plan.schema import (
    ChecksSection,
    ColumnSection,
    DerivedSection,
    ModelSection,
    Outcome,
    RecordsSection,
    Study,
)
from oddsmodel.plan.translate import offer
from oddsmodel.wording.plain import quoted

LONGEST_MODEL_NAME = 120
WITH_LEVELS = ("category", "ordered", "yes-no")
SAME_VALUES = {"1.0": ("true", "yes", "y"), "0.0": ("false", "no", "n")}
KEYS_FOR_LEVELS = ("levels", "reference", "other_levels")
KEYS_FOR_NUMBERS = ("per", "units", "plausible")
KEYS_FOR_COVARIATES = ("reference", "per", "units", "plausible", "timing", "why", "other_levels")


@dataclass(frozen=True)
class Parts:
    """The sections of a plan that are valid on their own; None or absent where one is not.

    models: by their position in the plan. data: the whole plan as read, for key paths. name: its file name.
    """

    study: Study | None
    records: RecordsSection | None
    columns: Mapping[str, ColumnSection]
    derived: Mapping[str, DerivedSection]
    outcome: Outcome | None
    models: Mapping[int, ModelSection]
    checks: ChecksSection | None
    data: Mapping[str, Any]
    name: str

    def at(self, *location: str | int) -> str:
        return f"{self.name}, {key_path(location, self.data)}"


def cross_check(parts: Parts) -> Iterator[Fault]:
    """The faults between the keys of a plan, section by section in the order of the contract."""
    yield from _study(parts)
    yield from _records(parts)
    for name, column in parts.columns.items():
        yield from _column(parts, name, column)
        yield from check_column(name, column, parts.models, parts.at)
    yield from check_renamed(parts.columns, parts.at)
    count = parts.records.count if parts.records else None
    outcome = parts.outcome.column if parts.outcome else None
    yield from check_derived(parts.derived, parts.columns, count, outcome, parts.at)
    yield from _outcome(parts)
    yield from _models(parts)
    yield from _checks(parts)


def _study(parts: Parts) -> Iterator[Fault]:
    if parts.study and parts.study.design in LATER_DESIGN:
        yield fault(LATER_DESIGN[parts.study.design], parts.at("study", "design"))


def _records(parts: Parts) -> Iterator[Fault]:
    if parts.records is None:
        return
    yield from faults_of_database(
        parts.records.source,
        parts.records.query,
        parts.records.table,
        parts.at("records", "source"),
        parts.at("records", "table" if parts.records.query is None else "query"),
    )
    yield from _groups(parts, parts.records)
    count = parts.records.count
    if count is not None and parts.outcome and parts.outcome.column == count:
        yield fault("outcome-is-the-count", parts.at("records", "count"), column=quoted(count))
    yield from check_repeats(parts.records, parts.outcome, parts.columns, parts.at)


def _groups(parts: Parts, records: RecordsSection) -> Iterator[Fault]:
    if records.grouped_by is None:
        return
    where = parts.at("records", "grouped_by")
    if parts.outcome and parts.outcome.column == records.grouped_by:
        yield fault("grouped-by-outcome", where)
    if records.count == records.grouped_by:
        yield fault("grouped-by-count", where)


def _column(parts: Parts, name: str, column: ColumnSection) -> Iterator[Fault]:
    if parts.outcome and name == parts.outcome.column:
        yield from _outcome_column(parts, name, column)
    elif parts.records and name == parts.records.count:
        yield from _count_column(parts, name, column)
    else:
        yield from _kind_and_keys(parts, name, column)
    yield from _levels(parts, name, column)


def _kind_and_keys(parts: Parts, name: str, column: ColumnSection) -> Iterator[Fault]:
    """Keys that the column's kind has no use for."""
    if column.kind is None:
        if column.per is not None and column.levels is not None:
            yield fault("per-beside-levels", parts.at("columns", name, "per"))
        return
    if column.kind not in WITH_LEVELS:
        for key in _given(column, KEYS_FOR_LEVELS):
            yield fault("key-for-levels", parts.at("columns", name, key), key=key, kind=column.kind)
    if column.kind != "number":
        for key in _given(column, KEYS_FOR_NUMBERS):
            yield fault("key-for-numbers", parts.at("columns", name, key), key=key, kind=column.kind)
    if column.kind == "ordered" and column.levels is None:
        yield fault("levels-missing-ordered", parts.at("columns", name))
    if column.kind == "yes-no" and column.levels is not None and len(set(column.levels)) > 2:
        yield fault("levels-yes-no", parts.at("columns", name, "levels"), number=len(set(column.levels)))


def _given(column: ColumnSection, keys: Sequence[str]) -> list[str]:
    return [key for key in keys if key in column.model_fields_set]


def _levels(parts: Parts, name: str, column: ColumnSection) -> Iterator[Fault]:
    if column.levels is None:
        return
    where = parts.at("columns", name, "levels")
    is_outcome = parts.outcome is not None and name == parts.outcome.column
    if len(column.levels) < 2 and not is_outcome:
        yield fault("levels-too-few", where, number=len(column.levels))
    yield from _repeated(column.levels, where, "level-repeated", "level")

    unrecorded = set(_not_recorded(parts, name))
    for level in dict.fromkeys(column.levels):
        if level in unrecorded:
            yield fault("level-not-recorded", where, level=quoted(level))
    if (
        column.reference is not None
        and column.levels
        and not _is_among(column.reference, column.levels)
        and not is_outcome
    ):
        yield fault(
            "reference-not-a-level",
            parts.at("columns", name, "reference"),
            reference=quoted(column.reference),
            **offer(column.reference, tuple(dict.fromkeys(column.levels))),
        )


def _is_among(value: str, levels: Sequence[str]) -> bool:
    """Whether a value may be one of the levels in some spelling (1, 1.0, true, yes); the records floor decides."""
    return _spelling(value) in {_spelling(level) for level in levels}


def _spelling(value: str) -> str:
    text = value.strip().casefold()
    for number, words in SAME_VALUES.items():
        if text in words:
            return number
    try:
        return repr(float(text))
    except ValueError:
        return text


def _repeated(words: Sequence[str], where: str, code: str, fact: str) -> Iterator[Fault]:
    seen: set[str] = set()
    told: set[str] = set()
    for word in words:
        if word in seen and word not in told:
            told.add(word)
            yield fault(code, where, **{fact: quoted(word)})
        seen.add(word)


def _outcome_column(parts: Parts, name: str, column: ColumnSection) -> Iterator[Fault]:
    for key in _given(column, KEYS_FOR_COVARIATES):
        code = "outcome-reference" if key == "reference" else "outcome-key"
        yield fault(code, parts.at("columns", name, key), column=quoted(name), key=key)
    if column.kind in ("identifier", "date", "ordered"):
        yield fault("outcome-kind", parts.at("columns", name, "kind"), kind=column.kind)
    if column.levels is None:
        return
    if len(set(column.levels)) != 2:
        yield fault("outcome-levels", parts.at("columns", name, "levels"), number=len(set(column.levels)))
    event = parts.outcome.event if parts.outcome else None
    if event is not None and not _is_among(event, column.levels):
        yield fault(
            "event-not-a-level", parts.at("outcome", "event"), event=quoted(event), **offer(event, column.levels)
        )


def _count_column(parts: Parts, name: str, column: ColumnSection) -> Iterator[Fault]:
    for key in _given(column, (*KEYS_FOR_LEVELS, *KEYS_FOR_NUMBERS)):
        yield fault("count-key", parts.at("columns", name, key), column=quoted(name), key=key)
    if column.kind not in (None, "number"):
        yield fault("count-kind", parts.at("columns", name, "kind"), kind=column.kind)


def _outcome(parts: Parts) -> Iterator[Fault]:
    outcome = parts.outcome
    if outcome is None:
        return
    yield from check_outcome(outcome, parts.data.get("outcome"), parts.columns, parts.at)
    if outcome.column and outcome.event is not None and outcome.event in _not_recorded(parts, outcome.column):
        yield fault("event-not-recorded", parts.at("outcome", "event"), event=quoted(outcome.event))


def _not_recorded(parts: Parts, column: str) -> Sequence[str]:
    """The texts that mean "not recorded" in a column: its own, or else those of all records."""
    section = parts.columns.get(column)
    if section and section.not_recorded is not None:
        return section.not_recorded
    return parts.records.not_recorded if parts.records else ()


def _models(parts: Parts) -> Iterator[Fault]:
    if parts.data.get("models") == []:
        yield fault("no-models", parts.name)
    yield from _model_names(parts)
    written = parts.data.get("models")
    yield from check_models(parts.models, written if isinstance(written, list | tuple) else (), parts.at)
    grouped = parts.records is not None and parts.records.grouped_by is not None
    for position, model in parts.models.items():
        if grouped and model.method not in (None, "maximum likelihood"):
            yield fault("method-of-grouped-records", parts.at("models", position, "method"))
        where = parts.at("models", position, "exposures")
        if _is_empty_list(parts, position, "exposures"):
            yield fault("no-exposures", where)
        yield from _repeated(model.exposures, where, "exposure-repeated", "exposure")
        for exposure in dict.fromkeys(model.exposures):
            if parts.outcome and exposure == parts.outcome.column_name:
                yield fault("exposure-is-the-outcome", where, exposure=quoted(exposure))
            elif parts.records and exposure == parts.records.count:
                yield fault("exposure-is-the-count", where, exposure=quoted(exposure))


def _is_empty_list(parts: Parts, position: int, key: str) -> bool:
    written = parts.data["models"][position]
    return isinstance(written, dict) and written.get(key) in ([], ())


def _model_names(parts: Parts) -> Iterator[Fault]:
    """Names must differ by more than capital letters and spaces, for they head tables and name files."""
    first: dict[str, int] = {}
    models = parts.data.get("models")
    for position, model in enumerate(models if isinstance(models, list) else []):
        name = model.get("name") if isinstance(model, dict) else None
        if not isinstance(name, str) or not name.strip():
            continue
        where = parts.at("models", position, "name")
        if len(name) > LONGEST_MODEL_NAME:
            yield fault("model-name-too-long", where, longest=LONGEST_MODEL_NAME)
        if any(unicodedata.category(character) in ("Cc", "Zl", "Zp") for character in name):
            yield fault("model-name-control", where)
        key = " ".join(name.split()).casefold()
        if key in first:
            yield fault("model-name-repeated", where, first=first[key] + 1, second=position + 1)
        first.setdefault(key, position)


def _checks(parts: Parts) -> Iterator[Fault]:
    for position, check in enumerate(parts.checks.also if parts.checks else ()):
        if check not in ASKED_CHECKS:
            where = parts.at("checks", "also", position)
            yield fault("check-unknown", where, check=quoted(check), **offer(check, ASKED_CHECKS))
