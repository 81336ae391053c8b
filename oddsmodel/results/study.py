"""The answers of a study as plain frozen values: what disclosure, export and report read.

Numbers are on the odds-ratio scale per the plan's `per` unless a name says `log`. A number that does not
exist is None, with a sentence under the same key in `reasons`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

from oddsmodel.findings import Finding
from oddsmodel.results.derived import DerivedColumn
from oddsmodel.results.figures import Figure
from oddsmodel.results.tables import Table

Role = Literal["intercept", "exposure", "adjustment"]


@dataclass(frozen=True, slots=True)
class WaldResult:
    lower: float | None
    upper: float | None
    p: float | None
    df: float | None = None


@dataclass(frozen=True, slots=True)
class ProfileResult:
    """Limits on the odds-ratio scale; None with a reason where none exists."""

    lower: float | None
    upper: float | None


@dataclass(frozen=True, slots=True)
class CrudeEstimate:
    """The estimate from a model of the exposure alone. `records` counts the records it rests on."""

    records: int | None
    odds_ratio: float | None
    wald: WaldResult | None = None
    profile: ProfileResult | None = None


@dataclass(frozen=True, slots=True)
class ExactResult:
    """Exact conditional limits on the odds-ratio scale and p-values; None with a reason where none exists.

    p_doubled: twice the smaller tail. p_by_probability: of all outcomes no more probable than the one observed.
    """

    median_unbiased: float | None
    lower: float | None
    upper: float | None
    mid_p_lower: float | None
    mid_p_upper: float | None
    p_doubled: float | None
    p_by_probability: float | None
    p_mid: float | None


@dataclass(frozen=True, slots=True)
class CoefficientResult:
    """One coefficient. `label` is its wording ("Smoking: current against never", "Age, per 10 years")."""

    term: str
    level: str | None
    reference: str | None
    levels: Mapping[str, str | None] | None
    role: Role
    label: str
    log_odds_ratio: float | None
    standard_error: float | None
    odds_ratio: float | None
    wald: WaldResult
    profile: ProfileResult
    shown: bool = True
    """False for a column of a spline, polynomial or interaction, whose own odds ratio has no meaning alone."""
    crude: CrudeEstimate | None = None
    crude_all_records: CrudeEstimate | None = None
    reasons: Mapping[str, str] = field(default_factory=dict)
    exact: ExactResult | None = None
    """Where the method is exact: its limits then lead."""


@dataclass(frozen=True, slots=True)
class WaldTest:
    """Wald's F with its two degrees of freedom, where the records have no likelihood."""

    f: float
    df: int
    df_denominator: int
    p: float


@dataclass(frozen=True, slots=True)
class TermTest:
    """Likelihood-ratio test of a term; terms that contain it are left out of both models.

    `term` is "all exposure columns" for the joint test of the exposure and "whole model" for the overall one.
    wald: stands in its place where records are grouped; `likelihood_ratio` and `p` are then None.
    """

    term: str
    df: int
    likelihood_ratio: float | None
    p: float | None
    reason: str | None = None
    wald: WaldTest | None = None


@dataclass(frozen=True, slots=True)
class Exclusion:
    """Records left out under one reason; `code` is the reason's code, `reason` its words."""

    code: str
    reason: str
    records: int | None


@dataclass(frozen=True, slots=True)
class Flow:
    """Records read, left out (each counted once, under the first reason that holds) and analysed."""

    read: int | None
    left_out: tuple[Exclusion, ...]
    analysed: int | None
    events: int | None


Verdict = Literal["fine", "look", "caution", "not applicable"]
Family = Literal["counting", "sparsity", "fit", "functional form", "influence", "collinearity", "independence"]


@dataclass(frozen=True, slots=True)
class CheckResult:
    """One check of one model.

    line: the plain sentence of the check ("" when it has none of its own: folded detail only).
    statistics: what goes into results.json under the check's name (plain numbers, None with a reason).
    """

    name: str
    family: Family
    title: str
    verdict: Verdict
    line: str
    statistics: Mapping[str, float | int | None] = field(default_factory=dict)
    reasons: Mapping[str, str] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()
    tables: tuple[Table, ...] = ()
    figures: tuple[Figure, ...] = ()
    explanation: str = ""
    """Folded text: what the check does, when it holds, its source."""


@dataclass(frozen=True, slots=True)
class CertificateResult:
    digits: float | None
    condition_number: float | None


@dataclass(frozen=True, slots=True)
class TrendResult:
    """A trend over the levels of an ordered column: its scores in place of the levels, all else as in the model.

    term: the term of its levels. scores: the levels in order with their scores. step: the log odds ratio per unit of
    score as a coefficient, None where it could not be estimated. trend, departure: likelihood-ratio tests of the score
    against nothing, and of the levels against the score.
    """

    column: str
    label: str
    term: str
    scores: tuple[tuple[str, float], ...]
    step: CoefficientResult | None
    trend: TermTest
    departure: TermTest
    reason: str | None = None


@dataclass(frozen=True, slots=True)
class ModelResult:
    """Everything about one fitted (or not fitted) model."""

    id: str
    name: str
    formula: str
    method: str
    added_by_program: bool
    variant: Mapping[str, str]
    role: str
    why: str
    level: float
    status: str
    exposures: tuple[str, ...]
    exposure_labels: tuple[str, ...]
    adjustment: tuple[str, ...]
    adjustment_labels: tuple[str, ...]
    flow: Flow
    records: int | None
    events: int | None
    patterns: int | None
    parameters: int
    log_likelihood: float | None
    null_log_likelihood: float | None
    coefficients: tuple[CoefficientResult, ...]
    terms: tuple[TermTest, ...]
    checks: tuple[CheckResult, ...]
    certificate: CertificateResult
    findings: tuple[Finding, ...]
    tables: tuple[Table, ...] = ()
    """Tables of this model's measures: "levels" (records, events, crude, adjusted by exposure level),
    "two_by_two" where the exposure has two levels, ..."""
    figures: tuple[Figure, ...] = ()
    reasons: Mapping[str, str] = field(default_factory=dict)
    based_on: str | None = None
    differs: str = ""
    """What sets the model apart from the one it builds upon, in words."""
    planned: bool | None = None
    trends: tuple[TrendResult, ...] = ()
    averages: tuple[CoefficientResult, ...] = ()
    """Each level of a column against the average of its levels, in place of the reference: `compare_with`."""
    groups: int | None = None
    """How many groups the records analysed belong to, where the plan groups them."""
    grouped_by: str | None = None
    """The label of the column that names the groups."""


@dataclass(frozen=True, slots=True)
class StandardDeviation:
    """What "per SD" stands for: the deviation of a column among the records of the main model."""

    column: str
    label: str
    units: str | None
    value: float


@dataclass(frozen=True, slots=True)
class RecordsResult:
    source: str
    sha256: str
    read: int | None
    excluded: tuple[Exclusion, ...]


@dataclass(frozen=True, slots=True)
class Provenance:
    """What the report was made from: the plan's text, versions, seed."""

    plan_name: str
    plan_text: str
    plan_sha256: str
    versions: Mapping[str, str]
    seed: int
    plan_facts: Mapping[str, Any] = field(default_factory=dict)
    """What the plan states, by section and key, as plain values without prose."""


@dataclass(frozen=True, slots=True)
class AdjustmentColumn:
    """A column of a model: what the plan says of it for the questions of cause, and how its values were taken."""

    name: str
    label: str
    timing: str
    why: str
    kind: str = ""
    units: str | None = None
    per: float | str = 1.0
    levels: tuple[str, ...] = ()
    reference: str | None = None


@dataclass(frozen=True, slots=True)
class StudyResults:
    """A whole study, with every count as it is: internal until disclosure has seen it."""

    title: str
    question: str
    design: str
    aim: str
    audience: str
    outcome: str
    outcome_label: str
    event: str
    event_share: float | None
    not_measured: tuple[str, ...]
    columns: tuple[AdjustmentColumn, ...]
    records: RecordsResult
    models: tuple[ModelResult, ...]
    characteristics: Table | None
    findings: tuple[Finding, ...]
    provenance: Provenance
    comparison: Table | None = None
    """The models side by side, where the plan has several."""
    comparison_figure: Figure | None = None
    notes: tuple[str, ...] = ()
    rules: tuple[str, ...] = ()
    """How the plan makes the outcome and which record of a person it uses, in words; no counts."""
    standard_deviations: tuple[StandardDeviation, ...] = ()
    derived: tuple[DerivedColumn, ...] = ()


@dataclass(frozen=True, slots=True)
class DisclosedResults:
    """Results that may leave: made only by `disclosure.disclose`, the only thing export and report accept."""

    study: StudyResults
    hide_counts_below: int
    audience: Literal["shareable", "internal"]
    hidden_cells: int
