"""One column as the plan sees it: its kind, its values coded, and everything about it that must be said."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Literal

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.errors import Fault
from oddsmodel.findings import Finding
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ColumnSection, Kind
from oddsmodel.records.faults import fault, in_column, in_plan
from oddsmodel.records.kinds import kind_of
from oddsmodel.records.levels import CodedLevels, code_levels, spelled_alike
from oddsmodel.records.numbers import code_number
from oddsmodel.records.plausible import within_plausible
from oddsmodel.records.raw import RawType
from oddsmodel.records.rows import Rows, Weights, occurrences
from oddsmodel.records.same_value import absent_mask, matching, same_value_key
from oddsmodel.records.suspected_codes import looks_not_recorded, suspected_codes
from oddsmodel.records.texts import without_texts
from oddsmodel.records.types import Column
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

Use = Literal["model", "outcome", "count", "none"]
WITH_LEVELS = ("category", "ordered", "yes-no")
FEW_WHOLE_NUMBERS = 10
MANY_LEVELS = 50
LEVELS_NAMED = 10


@dataclass(frozen=True, slots=True)
class CodedColumn:
    """A coded column (see `Records.frame`), with what is to be said of it.

    outside: the mask (n,) of rows whose level is not in the plan, where any is. implausible: the mask (n,) of rows
    whose number was set aside as outside the plausible range, where any is. day_first: for dates of which the values
    are a part, the order of day and month by sign (`dates.orders_of_dates`); None: the values say it.
    """

    values: pd.Series
    column: Column
    outside: NDArray[np.bool_] | None = None
    findings: tuple[Finding, ...] = ()
    faults: tuple[Fault, ...] = ()
    implausible: NDArray[np.bool_] | None = None
    day_first: Mapping[str, bool] | None = None


@dataclass(frozen=True)
class RawValues:
    """A raw column with its name and place.

    not_recorded: the plan's texts for this column; file_name: its name in the file, where the plan calls it otherwise;
    different: how many numbers are met at least, where `values` has only the lowest and the highest of them.
    """

    name: str
    values: pd.Series
    type: RawType
    source: str
    rows: Rows
    not_recorded: Collection[str]
    file_name: str | None = None
    different: int | None = None

    @property
    def where(self) -> str:
        return in_column(self.source, self.file_name or self.name)

    @cached_property
    def keys(self) -> frozenset[str]:
        return frozenset(same_value_key(text) for text in self.not_recorded)

    @cached_property
    def recorded(self) -> pd.Series:
        """The texts with those that mean "not recorded" taken out; numbers unchanged."""
        if not isinstance(self.values.dtype, pd.CategoricalDtype):
            return self.values
        return without_texts(self.values, absent_mask(list(self.values.cat.categories), self.keys))


def code_column(raw: RawValues, section: ColumnSection | None, use: Use) -> CodedColumn:
    """The column coded by its kind. Columns that the plan does not use carry no findings and no faults."""
    kind = kind_of(raw.recorded, raw.type, section, raw.rows.weights)
    column = described(raw.name, kind, section)
    if use == "none":
        return _unused(raw, column)
    if kind == "number":
        coded = _number(raw, column, section, use)
    elif kind in WITH_LEVELS:
        coded = _levels(raw, column, section, use)
    else:
        coded = _texts(raw, column)
    empty = not coded.faults and coded.outside is None and coded.values.isna().all()
    return replace(coded, findings=(finding("caution", "column-empty", column=raw.name),)) if empty else coded


def described(name: str, kind: Kind, section: ColumnSection | None) -> Column:
    """What the plan says of a column."""
    if section is None:
        return Column(name, kind, name)
    per = section.per if section.per is not None else 1.0
    return Column(
        name,
        kind,
        section.label or name,
        units=section.units,
        per=per,
        timing=section.timing,
        why=section.why,
        other_levels=section.other_levels,
    )


def _unused(raw: RawValues, column: Column) -> CodedColumn:
    if column.kind == "number":
        numbers, faults = code_number(raw.values, raw.keys, where=raw.where, rows=raw.rows)
        if not faults or raw.type == "number":
            return CodedColumn(pd.Series(numbers), column)
        column = replace(column, kind="category")
    if column.kind in WITH_LEVELS and raw.type != "empty" and len(raw.recorded.cat.categories) <= 1000:
        coded = _code_levels(raw, column.kind, None)
        return CodedColumn(coded.series(column.kind == "ordered"), replace(column, levels=coded.levels))
    return _texts(raw, column)


def _number(raw: RawValues, column: Column, section: ColumnSection | None, use: Use) -> CodedColumn:
    numbers, faults = code_number(raw.values, raw.keys, where=raw.where, rows=raw.rows)
    findings: list[Finding] = []
    plausible = section.plausible if section is not None else None
    numbers, implausible = within_plausible(numbers, plausible)
    if use == "model" and not faults:
        said = (section.kind, section.per, section.units, plausible) if section is not None else ()
        findings = _questions_of_numbers(raw, numbers, any(one is not None for one in said), plausible is None)
    return CodedColumn(pd.Series(numbers), column, None, tuple(findings), tuple(faults), implausible)


def _questions_of_numbers(
    raw: RawValues, numbers: NDArray[np.float64], declared: bool, codes_met: bool
) -> list[Finding]:
    """What is asked about a column of numbers: few whole numbers, and codes that may mean "not recorded".

    declared: the plan says that it is a number. codes_met: no plausible range has set codes aside already.
    """
    name = raw.name
    found, counts = numbers_met(numbers, raw.rows.weights)
    questions: list[Finding] = []
    if not declared and 0 < len(found) <= FEW_WHOLE_NUMBERS and np.all(found == np.trunc(found)):
        questions.append(
            finding("note", "few-whole-numbers", column=name, values=[same_value_key(number) for number in found])
        )
    codes = suspected_codes(found, counts, raw.different) if codes_met else []
    if codes:
        records = [int(counts[np.searchsorted(found, code)]) for code in codes]
        texts = [same_value_key(code) for code in codes]
        questions.append(finding("caution", "suspected-codes", column=name, values=texts, with_records=records))
    return questions


def numbers_met(
    numbers: NDArray[np.float64], weights: Weights | None = None
) -> tuple[NDArray[np.float64], NDArray[np.int64]]:
    """The different recorded numbers in order, and in how many rows each is met. weights (n,): rows for each number."""
    codes, found = pd.factorize(numbers)
    counts = occurrences(codes, len(found), weights)
    order = np.argsort(found)
    return np.asarray(found, dtype=np.float64)[order], counts[order]


def _levels(raw: RawValues, column: Column, section: ColumnSection | None, use: Use) -> CodedColumn:
    planned = section.levels if section is not None else None
    coded = _code_levels(raw, column.kind, planned)
    column = replace(column, levels=coded.levels)
    faults: list[Fault] = []
    outside = None
    if coded.outside:
        if planned is not None and column.other_levels == "exclude and count":
            outside = coded.codes == -2
        else:
            faults.append(_outside_fault(raw, column, coded, planned is not None))
    findings = _questions_of_levels(raw.name, coded, planned is not None, use)
    reference, reference_faults = _reference(column, coded, section)
    return CodedColumn(
        coded.series(column.kind == "ordered"),
        replace(column, reference=reference),
        outside,
        tuple(findings),
        (*faults, *reference_faults),
    )


def _outside_fault(raw: RawValues, column: Column, coded: CodedLevels, planned: bool) -> Fault:
    code = "level-not-in-plan" if planned else "not-yes-or-no"
    first = coded.outside[:LEVELS_NAMED]
    return fault(
        code,
        raw.where,
        values=[quoted(text) for text, _ in first],
        with_records=[count for _, count in first],
        total=len(coded.outside),
        section=in_plan(column.name),
        nearest=[_nearest(text, coded.levels) for text, _ in first],
    )


def _nearest(text: str, levels: Collection[str]) -> str:
    found = nearest(text, levels)
    return "" if found is None else quoted(found)


def _reference(column: Column, coded: CodedLevels, section: ColumnSection | None) -> tuple[str | None, list[Fault]]:
    """The reference by the plan, else the first level that is met."""
    met = [level for level, count in zip(coded.levels, coded.counts, strict=True) if count]
    wanted = section.reference if section is not None else None
    if wanted is None:
        return (met[0] if met else None), []
    found = matching(wanted, met)
    if found is not None:
        return found, []
    where = in_plan(column.name, "reference")
    shown = [quoted(level) for level in met[:LEVELS_NAMED]]
    return None, [
        fault("reference-not-met", where, reference=quoted(wanted), levels=shown, nearest=_nearest(wanted, met))
    ]


def _questions_of_levels(name: str, coded: CodedLevels, planned: bool, use: Use) -> list[Finding]:
    questions: list[Finding] = []
    met = [level for level, count in zip(coded.levels, coded.counts, strict=True) if count]
    absent = [level for level, count in zip(coded.levels, coded.counts, strict=True) if not count]
    if planned and absent:
        questions.append(finding("note", "level-absent", column=name, levels=absent))
    if planned or use == "outcome":
        return questions
    alike = spelled_alike(met)
    if alike:
        questions.append(finding("note", "levels-differ-by-case", column=name, levels=alike[:LEVELS_NAMED]))
    suspects = looks_not_recorded(met) + _codes_among(coded)
    if suspects:
        records = [count for level, count in zip(coded.levels, coded.counts, strict=True) if level in suspects]
        questions.append(finding("caution", "suspected-codes", column=name, values=suspects, with_records=records))
    if len(met) > MANY_LEVELS:
        questions.append(finding("caution", "many-levels", column=name, levels=len(met)))
    return questions


def _codes_among(coded: CodedLevels) -> list[str]:
    """Levels that are numbers and stand apart as codes do, where every level is a number."""
    keys = [same_value_key(level) for level in coded.levels]
    try:
        numbers = np.asarray([float(key) for key in keys])
    except ValueError:
        return []
    order = np.argsort(numbers)
    codes = suspected_codes(numbers[order], np.asarray(coded.counts, dtype=np.int64)[order])
    return [level for level, number in zip(coded.levels, numbers, strict=True) if number in codes]


def _texts(raw: RawValues, column: Column) -> CodedColumn:
    """An identifier, a date or a column that is only kept: a categorical of its texts."""
    if isinstance(raw.values.dtype, pd.CategoricalDtype):
        values = raw.recorded
    else:
        values = code_levels(raw.values, raw.keys, levels=None, kind=column.kind, weights=raw.rows.weights).series()
    findings: tuple[Finding, ...] = ()
    if column.kind == "identifier":
        met = occurrences(np.asarray(values.cat.codes, dtype=np.intp), 0, raw.rows.weights)
        findings = repeats_found(column.name, int(met.sum()), int((met > 0).sum()))
    return CodedColumn(values, column, None, findings)


def repeats_found(name: str, records: int, different: int) -> tuple[Finding, ...]:
    """What is to be said of an identifier that so many records have, and of which there are so many different ones."""
    if different == records:
        return ()
    return (finding("stop", "identifier-repeats", column=name, records=records, different=different),)


def _code_levels(raw: RawValues, kind: str, levels: Sequence[str] | None) -> CodedLevels:
    """The levels, in their own order where the categories came with one."""
    ordered = raw.type in ("category", "ordered")
    return code_levels(raw.values, raw.keys, levels=levels, kind=kind, keep_order=ordered, weights=raw.rows.weights)
