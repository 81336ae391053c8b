"""What changed between results of the same study, as values that may leave: made by the study floor for the report."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from oddsmodel.findings import Finding
from oddsmodel.results.figures import EstimatesFigure
from oddsmodel.results.tables import Table


@dataclass(frozen=True, slots=True)
class Refresh:
    """One of the results compared. `name` tells it from the others ("2 (autumn)"); the two digests are SHA-256."""

    name: str
    plan: str
    plan_sha256: str
    records_sha256: str
    versions: Mapping[str, str]


@dataclass(frozen=True, slots=True)
class Step:
    """From one refresh to the next.

    cause: what the differences can come from, the plan or the records. plan: what of the plan changed, a sentence a
    key. records: what changed in how the columns were taken, the plan being silent. programs: versions that changed.
    overlap: what can be known of records that are in both. models: which could be estimated before and not now, or
    the other way round. appeared, went: cautions and stops, with the model that each is of in its message.
    """

    before: str
    after: str
    cause: str
    plan: tuple[str, ...]
    records: tuple[str, ...]
    programs: str
    overlap: str
    models: tuple[str, ...]
    appeared: tuple[Finding, ...]
    went: tuple[Finding, ...]


@dataclass(frozen=True, slots=True)
class ModelChanges:
    """The exposure's odds ratios of one model, a series a contrast. figure: None where there is nothing to draw."""

    name: str
    figure: EstimatesFigure | None
    table: Table | None
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Changes:
    """The whole comparison, in the order the results were given. `counts` withholds small differences.

    cautions: what makes the results hard to compare at all.
    """

    title: str
    question: str
    internal: bool
    threshold: int
    refreshes: tuple[Refresh, ...]
    steps: tuple[Step, ...]
    counts: Table
    models: tuple[ModelChanges, ...]
    cautions: tuple[str, ...]
