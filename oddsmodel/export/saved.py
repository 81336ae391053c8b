"""results.json as it is read again: the keys that other pages are made from, strictly typed, all others ignored."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field


def _list_as_tuple(value: Any) -> Any:
    """JSON has lists where the results keep tuples."""
    return tuple(value) if isinstance(value, list) else value


class Saved(BaseModel):
    """A part of results.json. Keys that a later minor version adds are read over; nothing is converted."""

    model_config = ConfigDict(extra="ignore", strict=True, frozen=True, protected_namespaces=())


Count = Annotated[int, Field(ge=0, le=10**15)]
Text = Annotated[str, Field(max_length=20_000)]
Ratio = Annotated[float, Field(gt=0, allow_inf_nan=False)]
Limit = Annotated[float, Field(ge=0, allow_inf_nan=False)]
Texts = Annotated[tuple[Text, ...], BeforeValidator(_list_as_tuple)]


class SavedAnswer(Saved):
    label: Text
    sentence: Text


class SavedStudy(Saved):
    """`answer` is empty in results of version 1.0, which do not hold it."""

    title: Text
    question: Text
    design: Text
    outcome: Text
    event: Text
    answer: Annotated[tuple[SavedAnswer, ...], BeforeValidator(_list_as_tuple)] = ()


class SavedDisclosure(Saved):
    audience: Literal["shareable", "internal"]
    hide_counts_below: Annotated[int, Field(ge=0, le=1000)]


class SavedExclusion(Saved):
    code: Text = ""
    reason: Text
    records: Count | None


class SavedRecords(Saved):
    read: Count | None
    excluded: Annotated[tuple[SavedExclusion, ...], BeforeValidator(_list_as_tuple)]
    sha256: Text


class SavedLimits(Saved):
    lower: Limit | None
    upper: Ratio | None


class SavedCoefficient(Saved):
    term: Text
    level: Text | None
    reference: Text | None
    levels: dict[str, Text | None] | None
    role: Literal["intercept", "exposure", "adjustment"]
    label: Text
    odds_ratio: Ratio | None
    wald: SavedLimits
    profile: SavedLimits
    exact: SavedLimits | None = None
    reasons: dict[str, Text] = {}


class SavedFinding(Saved):
    severity: Literal["note", "caution", "stop"]
    code: Text
    message: Text


Findings = Annotated[tuple[SavedFinding, ...], BeforeValidator(_list_as_tuple)]


class SavedModel(Saved):
    name: Text
    formula: Text
    method: Text
    added_by_program: bool
    variant: dict[str, Text]
    level: Annotated[float, Field(gt=0, lt=1)] = 0.95
    status: Text = "converged"
    exposures: Texts = ()
    adjustment: Texts = ()
    records: Count | None
    events: Count | None
    coefficients: Annotated[tuple[SavedCoefficient, ...], BeforeValidator(_list_as_tuple)]
    averages: Annotated[tuple[SavedCoefficient, ...], BeforeValidator(_list_as_tuple)] = ()
    findings: Findings


class SavedColumn(Saved):
    name: Text
    label: Text
    kind: Text
    units: Text | None
    per: Literal["SD"] | float
    levels: Texts
    reference: Text | None


class SavedProvenance(Saved):
    plan: Text
    plan_sha256: Text
    versions: dict[str, Text]
    seed: int


class SavedResults(Saved):
    """One results.json. `plan` and `columns` are None in results of version 1.0, which do not hold them."""

    schema_version: Text
    study: SavedStudy
    disclosure: SavedDisclosure
    records: SavedRecords
    models: Annotated[tuple[SavedModel, ...], BeforeValidator(_list_as_tuple)]
    findings: Findings
    provenance: SavedProvenance
    plan: dict[str, dict[str, Any] | list[dict[str, Any]]] | None = None
    columns: Annotated[tuple[SavedColumn, ...], BeforeValidator(_list_as_tuple)] | None = None

    @property
    def internal(self) -> bool:
        return self.disclosure.audience == "internal"
