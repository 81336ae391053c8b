"""What the plan has to do with the columns of a file: which it uses, as what, and what it says of them together."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ColumnSection, Kind, StudyPlan
from oddsmodel.records.coding import WITH_LEVELS, CodedColumn, Use
from oddsmodel.records.condition import vet_condition
from oddsmodel.records.derived.making import place
from oddsmodel.records.faults import fault, in_column, in_plan
from oddsmodel.records.mentions import is_mentioned
from oddsmodel.records.raw import RawTable
from oddsmodel.records.renamed import file_name
from oddsmodel.records.types import Column
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

AS_WRITTEN = (*WITH_LEVELS, "identifier", "date")


def kept_as_written(plan: StudyPlan) -> list[str]:
    """The columns, as the file calls them, of which delimited text is kept as written, because 01 may not be 1."""
    wide = set(plan.records.not_recorded)
    roles = kinds_by_role(plan)
    as_written = [
        name
        for name, section in plan.columns.items()
        if section.kind in AS_WRITTEN
        or name in roles
        or section.levels is not None
        or section.reference is not None
        or (section.not_recorded is not None and not wide - {""} <= set(section.not_recorded))
    ]
    as_written += [name for name in roles if name not in plan.columns]
    grouped = [one.groups_of for one in plan.derived.values() if one.groups_of is not None]
    as_written += [name for name in grouped if name not in plan.columns]
    return [file_name(name, plan) for name in as_written]


def columns_used(plan: StudyPlan, names: Iterable[str]) -> set[str]:
    """The columns that the plan has a use for: named by a key, or met in a formula or in a condition."""
    names = list(names)
    return columns_in_use(plan, names) | {name for name in names if name in plan.columns}


def columns_in_use(plan: StudyPlan, names: Iterable[str]) -> set[str]:
    """The columns that the plan does something with, beside saying what they are."""
    used = {plan.outcome.column, *plan.outcome.dates}
    used.update(source for section in plan.derived.values() for source in section.sources)
    texts = [text for model in plan.models for text in (model.formula, *model.add)]
    if plan.outcome.event_when is not None:
        texts.append(plan.outcome.event_when)
    texts += [keep for keep in (plan.records.keep, *(model.keep for model in plan.models)) if keep is not None]
    for model in plan.models:
        used.update(model.exposures)
    if plan.records.count is not None:
        used.add(plan.records.count)
    return {name for name in names if name in used or any(is_mentioned(name, text) for text in texts)}


def kinds_by_role(plan: StudyPlan) -> dict[str, Kind]:
    """The kinds of columns that follow from what the plan uses them for."""
    kinds: dict[str, Kind] = dict.fromkeys(plan.outcome.dates, "date")
    for section in plan.derived.values():
        kinds.update(dict.fromkeys(section.years_between or (), "date"))
    if plan.records.repeats is not None:
        kinds.setdefault(plan.records.repeats.of, "identifier")
    if plan.records.grouped_by is not None:
        kinds.setdefault(plan.records.grouped_by, "identifier")
    return kinds


def section_of(name: str, plan: StudyPlan) -> ColumnSection | None:
    """What the plan says of a column, its kind by its role where the section leaves that open."""
    section, kind = plan.columns.get(name), kinds_by_role(plan).get(name)
    if kind is None or (section is not None and (section.kind or section.levels)):
        return section
    return (section or ColumnSection()).model_copy(update={"kind": kind})


def use_of(name: str, used: set[str], plan: StudyPlan) -> Use:
    """What a column is for; used: the columns that the plan has a use for."""
    if name == plan.outcome.column:
        return "outcome"
    if name == plan.records.count:
        return "count"
    return "model" if name in used else "none"


def columns_missing(table: RawTable, plan: StudyPlan, used: set[str]) -> list[Fault]:
    """Faults for columns that the plan names and the file does not have, or that hold what cannot be coded."""
    named: dict[str, str] = {}
    for key in ("column", "start", "event_date", "followed_to"):
        if (asked := getattr(plan.outcome, key)) is not None:
            named[asked] = f"the plan, [outcome] {key}"
    if plan.records.repeats is not None:
        for asked in (plan.records.repeats.of, plan.records.repeats.ordered_by):
            named.setdefault(asked, "the plan, [records] repeats")
            used = used | {asked}
    if plan.records.count is not None:
        named.setdefault(plan.records.count, "the plan, [records] count")
    if plan.records.grouped_by is not None:
        named.setdefault(plan.records.grouped_by, "the plan, [records] grouped_by")
        used = used | {plan.records.grouped_by}
    for name in plan.columns:
        named.setdefault(name, in_plan(name, "from" if file_name(name, plan) != name else ""))
    for name, section in plan.derived.items():
        for source in section.sources:
            named.setdefault(source, place(name))
    for model in plan.models:
        for name in model.exposures:
            named.setdefault(name, f"the plan, [[models]] {quoted(model.name)} exposures")
    known = [*table.frame.columns, *table.refused, *plan.derived]
    faults = []
    for name, where in named.items():
        if name not in known:
            sought = file_name(name, plan)
            near = nearest(sought, known)
            facts = {"column": quoted(sought), "nearest": "" if near is None else quoted(near)}
            faults.append(fault("column-not-in-file", where, **facts))
    for name in sorted(used & set(table.refused)):
        where = in_column(table.source, file_name(name, plan))
        faults.append(fault("column-not-codable", where, holds=table.refused[name]))
    return faults


def faults_of_conditions(
    plan: StudyPlan, coded: Mapping[str, CodedColumn], columns: Mapping[str, Column]
) -> list[Fault]:
    """Faults of every `keep`, told where no column it could use is itself at fault. columns: all that there are."""
    conditions = [(plan.records.keep, "the plan, [records] keep")]
    conditions += [(model.keep, f"the plan, [[models]] {quoted(model.name)} keep") for model in plan.models]
    faults: list[Fault] = []
    for text, where in conditions:
        if text is None or any(column.faults and is_mentioned(name, text) for name, column in coded.items()):
            continue
        try:
            vet_condition(text, columns, where)
        except InputFault as found:
            faults.extend(found.faults)
    return faults


def references_taken(plan: StudyPlan, coded: Mapping[str, CodedColumn], used: set[str]) -> list[Finding]:
    """One note on the references that the plan left open, among the columns that a model compares."""
    formulas = [text for model in plan.models for text in (model.formula, *model.add)]
    made_use_of = {*plan.derived, *(source for section in plan.derived.values() for source in section.sources)}
    aside = {name for name in made_use_of if not any(is_mentioned(name, text) for text in formulas)}
    open_columns = [
        column.column
        for name, column in coded.items()
        if name in used - {plan.outcome.column_name} - aside
        and column.column.kind in ("category", "ordered")
        and column.column.reference is not None
        and all(name not in of_plan or of_plan[name].reference is None for of_plan in (plan.columns, plan.derived))
    ]
    if not open_columns:
        return []
    names = [column.name for column in open_columns]
    return [finding("note", "references-taken", columns=names, levels=[column.reference for column in open_columns])]


def is_of_persons(said: Finding, column: str) -> bool:
    """Whether it is the stop at an identifier that repeats, of the column by which persons are told apart."""
    return said.code == "identifier-repeats" and said.facts["column"] == column


def plausible_ranges(plan: StudyPlan) -> dict[str, tuple[float, ...]]:
    """The ranges outside which numbers are set aside, by column."""
    ranges = {name: section.plausible for name, section in plan.columns.items()}
    ranges |= {name: section.plausible for name, section in plan.derived.items()}
    return {name: limits for name, limits in ranges.items() if limits is not None}


def outcome_can_be_made(plan: StudyPlan, coded: Mapping[str, CodedColumn]) -> bool:
    """Whether the plan makes its outcome, and nothing that it is made from is missing or at fault itself."""
    outcome = plan.outcome
    if outcome.column is not None or any(name not in coded or coded[name].faults for name in outcome.dates):
        return False
    text = outcome.event_when or ""
    return not any(column.faults and is_mentioned(name, text) for name, column in coded.items())
