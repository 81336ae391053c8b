"""The study plan as strict types: unknown keys are errors, `true` is not a number."""

from __future__ import annotations

import math
from datetime import date, datetime
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field
from pydantic.fields import FieldInfo
from pydantic_core import PydanticCustomError

from oddsmodel.plan.size import bytes_of

Design = Literal["cohort", "cross-sectional", "case-control", "matched case-control", "trial"]
Kind = Literal["number", "category", "ordered", "yes-no", "identifier", "date"]
Timing = Literal["before exposure", "after exposure", "unknown"]

LARGEST_SEED = 2**63 - 1
LONGEST_WINDOW = 73_000
"""Days: some two hundred years."""


def _list_as_tuple(value: Any) -> Any:
    """TOML has lists where the plan keeps tuples."""
    return tuple(value) if isinstance(value, list) else value


def _cell_text(value: Any) -> Any:
    """Number and true-false spellings of a cell as text, so that `event = 1` and `event = "1"` are the same value."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int):
        return str(value)
    if isinstance(value, float) and math.isfinite(value):
        return str(int(value)) if value.is_integer() else repr(value)
    return value


def _unit_of_odds_ratio(value: Any) -> Any:
    """A positive number or "SD"; anything else is told once, not once for each alternative."""
    if isinstance(value, str):
        if value == "SD":
            return value
        raise PydanticCustomError("per_text", "a text other than SD")
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise PydanticCustomError("per_type", "neither a number nor SD")
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if not math.isfinite(number) or number <= 0:
        raise PydanticCustomError("per_range", "not a positive number")
    return number


def _day(value: Any) -> Any:
    """A TOML date, or its ISO text."""
    if isinstance(value, str):
        try:
            return date.fromisoformat(value)
        except ValueError:
            raise PydanticCustomError("not_a_day", "a text that is no date") from None
    if isinstance(value, datetime) or not isinstance(value, date):
        raise PydanticCustomError("not_a_day", "no date")
    return value


def _size(value: Any) -> Any:
    """A size of memory, such as "2 GB"."""
    if not isinstance(value, str) or bytes_of(value) is None:
        raise PydanticCustomError("not_a_size", "no size of memory")
    return value


def _named_groups(value: Any) -> Any:
    """A whole number of groups, or the levels of each group by its name."""
    if isinstance(value, int) and not isinstance(value, bool):
        return value
    if not isinstance(value, dict) or not all(isinstance(levels, list | tuple) for levels in value.values()):
        raise PydanticCustomError("groups_type", "neither a number of groups nor the levels of each")
    named = {name: tuple(_cell_text(level) for level in levels) for name, levels in value.items()}
    if not all(isinstance(level, str) for levels in named.values() for level in levels):
        raise PydanticCustomError("groups_type", "a level that is not a text")
    return named


Words = Annotated[str, Field(pattern=r"\S")]
Name = Annotated[str, Field(min_length=1)]
Names = Annotated[tuple[Name, ...], BeforeValidator(_list_as_tuple)]
CellText = Annotated[str, BeforeValidator(_cell_text)]
CellTexts = Annotated[tuple[CellText, ...], BeforeValidator(_list_as_tuple)]
Numbers = Annotated[tuple[float, ...], BeforeValidator(_list_as_tuple)]
Day = Annotated[date, BeforeValidator(_day)]
Groups = Annotated[int | dict[str, tuple[str, ...]], BeforeValidator(_named_groups)]
Per = Annotated[float | Literal["SD"], BeforeValidator(_unit_of_odds_ratio)]


class Section(BaseModel):
    """A section of the plan: nothing unknown, nothing converted, nothing changed later."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


class Study(Section):
    """What is asked, and how the records came about."""

    title: Words
    question: str = ""
    design: Design
    aim: Literal["association", "prediction"] = "association"
    not_measured: Names = ()


class Repeats(Section):
    """Which record of each person is used: of the column that tells persons apart, the first or last by another."""

    of: Name
    use: Literal["first", "last"]
    ordered_by: Name


class RecordsSection(Section):
    """Where the records are, who belongs, and what one row stands for."""

    source: Words
    query: Words | None = None
    table: Words | None = None
    not_recorded: CellTexts = ("",)
    keep: Words | None = None
    count: Name | None = None
    repeats: Repeats | None = None
    grouped_by: Name | None = None


class ColumnSection(Section):
    """What the plan says of one column; what it leaves out is inferred from the records."""

    kind: Kind | None = None
    levels: CellTexts | None = None
    reference: CellText | None = None
    other_levels: Literal["stop", "exclude and count"] = "stop"
    label: Words | None = None
    timing: Timing = "unknown"
    why: str = ""
    units: Words | None = None
    per: Per | None = None
    not_recorded: CellTexts | None = None
    scores: Numbers | None = None
    compare_with: Literal["reference", "network average"] = "reference"
    from_name: Name | None = Field(default=None, alias="from")
    plausible: Numbers | None = None


class DerivedSection(Section):
    """A column made from others: the one rule that makes it with the keys of that rule, and what is said of it."""

    bands_of: Name | None = None
    edges: Numbers | None = None
    years_between: Names | None = None
    points: dict[str, float] | None = None
    if_part_missing: Literal["not recorded", "zero"] = "not recorded"
    groups_of: Name | None = None
    quantile_groups_of: Name | None = None
    groups: Groups | None = None
    other_levels: Literal["stop", "exclude and count"] = "stop"
    plausible: Numbers | None = None
    label: Words | None = None
    units: Words | None = None
    per: Per | None = None
    reference: CellText | None = None
    timing: Timing = "unknown"
    why: str = ""

    @property
    def sources(self) -> tuple[str, ...]:
        """The columns that it is made from, in the order of the plan."""
        alone = [one for one in (self.bands_of, self.groups_of, self.quantile_groups_of) if one is not None]
        return (*alone, *(self.years_between or ()), *(self.points or {}))


class Outcome(Section):
    """The outcome: a column and the value that is the event, a condition, or dates and a window of days.

    `event_when` and the dates make a new column, which formulas call by `name`.
    """

    column: Name | None = None
    event: CellText | None = None
    label: Words | None = None
    name: Name | None = None
    event_when: Words | None = None
    start: Name | None = None
    event_date: Name | None = None
    followed_to: Name | None = None
    within_days: Annotated[int, Field(ge=1, le=LONGEST_WINDOW)] | None = None
    from_day: Annotated[int, Field(ge=0, le=LONGEST_WINDOW)] = 0
    extracted: Day | None = None

    @property
    def column_name(self) -> str:
        """What formulas and results call the outcome: its column in the records, or the one made by the plan."""
        return self.column or self.name or "outcome"

    @property
    def dates(self) -> tuple[str, ...]:
        """The columns of dates that the outcome is made from."""
        return tuple(name for name in (self.start, self.event_date, self.followed_to) if name is not None)


Method = Literal["maximum likelihood", "penalised", "log-F", "exact"]


class Prior(Section):
    """A log-F(m, m) prior for the odds ratios of some columns, per the plan's unit and against its reference."""

    m: Annotated[float, Field(ge=0.01, le=1000, allow_inf_nan=False)]
    columns: Names


class ModelSection(Section):
    """One model: its formula, and which of its columns the question is about.

    A model that is `based_on` an earlier one has that one's formula, exposures, level and `keep`, but for what it says
    itself: `add` and `leave_out` change the formula, its own `keep` must hold beside the base's. `same_records` is true
    unless said otherwise, except for sensitivity and subgroup models and those whose `keep` narrows their base: these
    rest on their own complete records, so that they leave the records of the other models alone.
    """

    name: Words
    formula: Words = ""
    exposures: Names = ()
    level: Annotated[float, Field(ge=0.5, le=0.999, allow_inf_nan=False)] = 0.95
    keep: Words | None = None
    same_records: bool = True
    based_on: Words | None = None
    add: Names = ()
    leave_out: Names = ()
    role: Literal["sensitivity", "subgroup", "secondary"] | None = None
    why: str = ""
    planned: bool | None = None
    trend: Names = ()
    method: Method | None = None
    prior: Prior | None = None


class ReportSection(Section):
    """Who reads the report, and which counts are too small to show them."""

    audience: Literal["shareable", "internal"] = "shareable"
    hide_counts_below: Annotated[int, Field(ge=0, le=1000)] = 5


class ChecksSection(Section):
    """Checks beyond those always done."""

    also: Names = ()


class RunSection(Section):
    """How the work is run."""

    seed: Annotated[int, Field(ge=0, le=LARGEST_SEED)] = 20260101
    memory: Annotated[str, BeforeValidator(_size)] | None = None


Columns = dict[str, ColumnSection]
DerivedColumns = dict[str, DerivedSection]
Models = Annotated[tuple[ModelSection, ...], BeforeValidator(_list_as_tuple)]


class StudyPlan(Section):
    """A whole plan. Its TOML text and file name are kept beside it by `plan.read.PlanFile`."""

    study: Study
    records: RecordsSection
    columns: Columns = {}
    derived: DerivedColumns = {}
    outcome: Outcome
    models: Models
    report: ReportSection = ReportSection()
    checks: ChecksSection = ChecksSection()
    run: RunSection = RunSection()


SECTIONS: dict[str, type[Section]] = {
    "study": Study,
    "records": RecordsSection,
    "columns": ColumnSection,
    "derived": DerivedSection,
    "outcome": Outcome,
    "models": ModelSection,
    "report": ReportSection,
    "checks": ChecksSection,
    "run": RunSection,
}
"""The type of each section; of `columns`, `derived` and `models` the type of one of their entries."""


def keys_of(section: type[Section]) -> dict[str, FieldInfo]:
    """The keys of a section as the plan writes them."""
    return {field.alias or name: field for name, field in section.model_fields.items()}
