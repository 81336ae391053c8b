"""The study plan as strict types: unknown keys are errors, `true` is not a number."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

Design = Literal["cohort", "cross-sectional", "case-control", "matched case-control", "trial"]
Kind = Literal["number", "category", "ordered", "yes-no", "identifier", "date"]
Timing = Literal["before exposure", "after exposure", "unknown"]


class Section(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


class Study(Section):
    title: str
    question: str = ""
    design: Design
    aim: Literal["association", "prediction"] = "association"
    not_measured: tuple[str, ...] = ()


class RecordsSection(Section):
    source: str
    not_recorded: tuple[str, ...] = ("",)
    keep: str | None = None
    count: str | None = None


class ColumnSection(Section):
    kind: Kind | None = None
    levels: tuple[str, ...] | None = None
    reference: str | None = None
    other_levels: Literal["stop", "exclude and count"] = "stop"
    label: str | None = None
    timing: Timing = "unknown"
    why: str = ""
    units: str | None = None
    per: float | Literal["SD"] | None = None
    not_recorded: tuple[str, ...] | None = None


class Outcome(Section):
    column: str
    event: str | None = None
    label: str | None = None


class ModelSection(Section):
    name: str
    formula: str
    exposures: tuple[str, ...]
    level: Annotated[float, Field(ge=0.5, le=0.999)] = 0.95
    keep: str | None = None
    same_records: bool = True


class ReportSection(Section):
    audience: Literal["shareable", "internal"] = "shareable"
    hide_counts_below: Annotated[int, Field(ge=0, le=1000)] = 5


class ChecksSection(Section):
    also: tuple[str, ...] = ()


class RunSection(Section):
    seed: int = 20260101


class StudyPlan(Section):
    """A whole plan. Its TOML text and file name are kept beside it by `plan.read.PlanFile`."""

    study: Study
    records: RecordsSection
    columns: dict[str, ColumnSection] = {}
    outcome: Outcome
    models: tuple[ModelSection, ...]
    report: ReportSection = ReportSection()
    checks: ChecksSection = ChecksSection()
    run: RunSection = RunSection()
