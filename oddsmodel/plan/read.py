"""Read a study plan: every fault of the plan alone is found and told together."""

from __future__ import annotations

import copy
import hashlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from typing import Any, TypeVar

from pydantic import ValidationError

from oddsmodel.errors import Fault, InputFault
from oddsmodel.plan.crosscheck import Parts, cross_check
from oddsmodel.plan.faults import fault
from oddsmodel.plan.schema import (
    ChecksSection,
    ColumnSection,
    DerivedSection,
    ModelSection,
    Outcome,
    RecordsSection,
    Section,
    Study,
    StudyPlan,
)
from oddsmodel.plan.syntax import parse
from oddsmodel.plan.toml_text import document
from oddsmodel.plan.translate import Error, translate
from oddsmodel.wording.plain import plain

LARGEST_PLAN_MEGABYTES = 1
MOST_FAULTS = 40

SomeSection = TypeVar("SomeSection", bound=Section)


@dataclass(frozen=True)
class PlanFile:
    """A valid plan with the file it was read from: its text and the SHA-256 of its bytes (64 hexadecimal digits)."""

    plan: StudyPlan
    path: Path
    text: str
    sha256: str


def read_plan(path: Path) -> PlanFile:
    """The plan in a TOML file, UTF-8 with or without byte order mark.

    Raises InputFault with all faults of the plan alone (beyond 40 their number): the file, its TOML, unknown
    or missing keys, values of the wrong kind, and keys that contradict one another.
    """
    raw = _bytes(path)
    text = _text(raw, path)
    name = plain(path.name)
    plan = _validated(parse(text, name), name)
    return PlanFile(plan=plan, path=path, text=text, sha256=hashlib.sha256(raw).hexdigest())


def plan_from_values(values: Mapping[str, Any], name: str = "oddsmodel.fit") -> PlanFile:
    """The plan from plain values, laid out as TOML would give them. `name` stands for the plan in messages.

    Its text is the same plan written as TOML. Raises InputFault with all faults.
    """
    plan = _validated(values, name)
    text = document(values)
    return PlanFile(plan=plan, path=Path(name), text=text, sha256=hashlib.sha256(text.encode()).hexdigest())


def _validated(data: Mapping[str, Any], name: str) -> StudyPlan:
    errors: list[Error] = []
    plan: StudyPlan | None = None
    try:
        plan = StudyPlan.model_validate(data)
    except ValidationError as error:
        found = error.errors(include_url=False)
        errors = [Error(one["type"], one["loc"], one["input"], one["msg"], name, data) for one in found]
    faults = _told(_all_faults(errors, data, name), name)
    if faults or plan is None:
        raise InputFault(faults)
    return plan


def _all_faults(errors: list[Error], data: Mapping[str, Any], name: str) -> Iterator[Fault]:
    for error in errors:
        told = translate(error)
        if told is not None:
            yield told
    yield from cross_check(_parts(data, errors, name))


def _told(faults: Iterator[Fault], name: str) -> list[Fault]:
    """The faults; of very many the first, with the number of the others."""
    told = list(islice(faults, MOST_FAULTS))
    others = sum(1 for _ in faults)
    return [*told, fault("more-faults", name, number=others)] if others else told


def _parts(data: Mapping[str, Any], errors: list[Error], name: str) -> Parts:
    """The sections that are valid once the values at fault are taken out of them."""
    sound = _without(data, errors)
    columns, models = sound.get("columns"), sound.get("models")
    valid_columns = {
        column: _valid(ColumnSection, section)
        for column, section in (columns.items() if isinstance(columns, dict) else ())
    }
    derived = sound.get("derived")
    valid_derived = {
        column: _valid(DerivedSection, section)
        for column, section in (derived.items() if isinstance(derived, dict) else ())
    }
    valid_models = {
        position: _valid(ModelSection, section)
        for position, section in enumerate(models if isinstance(models, list) else ())
    }
    return Parts(
        study=_valid(Study, sound.get("study")),
        records=_valid(RecordsSection, sound.get("records")),
        columns={column: section for column, section in valid_columns.items() if section is not None},
        derived={column: section for column, section in valid_derived.items() if section is not None},
        outcome=_valid(Outcome, sound.get("outcome")),
        models={position: model for position, model in valid_models.items() if model is not None},
        checks=_valid(ChecksSection, sound.get("checks")),
        data=data,
        name=name,
    )


def _valid(kind: type[SomeSection], section: Any) -> SomeSection | None:
    try:
        return kind.model_validate(section)
    except ValidationError:
        return None


def _without(data: Mapping[str, Any], errors: list[Error]) -> dict[str, Any]:
    """A copy of the plan without the values at fault; models keep their positions."""
    if not errors:
        return dict(data)
    sound: dict[str, Any] = copy.deepcopy(dict(data))
    for error in errors:
        if error.kind == "missing":
            continue
        holder: Any = sound
        *way, last = error.location[: 3 if error.section in ("columns", "derived", "models") else 2]
        for part in way:
            holder = holder[int(part)] if isinstance(holder, list) else holder.get(part, {})
        if isinstance(holder, list):
            holder[int(last)] = None
        elif isinstance(holder, dict):
            holder.pop(last, None)
    return sound


def _bytes(path: Path) -> bytes:
    where = plain(str(path))
    limit = LARGEST_PLAN_MEGABYTES * 1_000_000
    try:
        if path.is_dir():
            raise InputFault(fault("plan-is-a-folder", where))
        if not path.exists():
            raise InputFault(fault("plan-missing", where))
        if not path.is_file():
            raise InputFault(fault("plan-not-a-file", where))
        with path.open("rb") as file:
            raw = file.read(limit + 1)
    except OSError as error:
        raise InputFault(fault("plan-unreadable", where, reason=error.strerror or type(error).__name__)) from None
    if len(raw) > limit:
        raise InputFault(fault("plan-too-large", where, megabytes=LARGEST_PLAN_MEGABYTES))
    return raw


def _text(raw: bytes, path: Path) -> str:
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise InputFault(fault("plan-not-utf-8", plain(str(path)), line=line)) from None
