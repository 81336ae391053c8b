"""The study plan as strict types: unknown keys are errors, `true` is not a number."""

from __future__ import annotations

import math
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field
from pydantic_core import PydanticCustomError

Design = Literal["cohort", "cross-sectional", "case-control", "matched case-control", "trial"]
Kind = Literal["number", "category", "ordered", "yes-no", "identifier", "date"]
Timing = Literal["before exposure", "after exposure", "unknown"]

LARGEST_SEED = 2**63 - 1


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


Words = Annotated[str, Field(pattern=r"\S")]
Name = Annotated[str, Field(min_length=1)]
Names = Annotated[tuple[Name, ...], BeforeValidator(_list_as_tuple)]
CellText = Annotated[str, BeforeValidator(_cell_text)]
CellTexts = Annotated[tuple[CellText, ...], BeforeValidator(_list_as_tuple)]
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


class RecordsSection(Section):
    """Where the records are, who belongs, and what one row stands for."""

    source: Words
    not_recorded: CellTexts = ("",)
    keep: Words | None = None
    count: Name | None = None


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


class Outcome(Section):
    """The column of the outcome and the value that is the event."""

    column: Name
    event: CellText | None = None
    label: Words | None = None


class ModelSection(Section):
    """One model: its formula, and which of its columns the question is about."""

    name: Words
    formula: Words
    exposures: Names
    level: Annotated[float, Field(ge=0.5, le=0.999, allow_inf_nan=False)] = 0.95
    keep: Words | None = None
    same_records: bool = True


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


Columns = dict[str, ColumnSection]
Models = Annotated[tuple[ModelSection, ...], BeforeValidator(_list_as_tuple)]


class StudyPlan(Section):
    """A whole plan. Its TOML text and file name are kept beside it by `plan.read.PlanFile`."""

    study: Study
    records: RecordsSection
    columns: Columns = {}
    outcome: Outcome
    models: Models
    report: ReportSection = ReportSection()
    checks: ChecksSection = ChecksSection()
    run: RunSection = RunSection()


SECTIONS: dict[str, type[Section]] = {
    "study": Study,
    "records": RecordsSection,
    "columns": ColumnSection,
    "outcome": Outcome,
    "models": ModelSection,
    "report": ReportSection,
    "checks": ChecksSection,
    "run": RunSection,
}
"""The type of each section; of `columns` and `models` the type of one of their entries."""
