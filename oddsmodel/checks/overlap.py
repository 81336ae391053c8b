"""Overlap: whether people with and without the exposure can be compared across the adjustment columns."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from oddsmodel.checks.exposure import MATTERS, Moved, moved
from oddsmodel.checks.preference import (
    BINS,
    Comparison,
    Inside,
    coefficients_near,
    compare,
    fit_kept,
    made_once,
    with_places,
)
from oddsmodel.checks.variation import variation_explained
from oddsmodel.findings import Finding
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import HistogramFigure
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import finding, say

SOME, MANY = 0.05, 0.20
"""Shares of the records outside the overlap from which the check asks for a look, and for caution."""

A_FEW = 20
"""Fewer records than this, outside or inside the overlap, are told without a share that would give them away."""

MUCH, MOST = 0.75, 0.90
"""The same for the share of a number exposure's variance that the adjustment columns explain."""

_ORDER: tuple[Verdict, ...] = ("not applicable", "fine", "look", "caution")


class _Gathered:
    """What is known of all exposures so far."""

    def __init__(self) -> None:
        self.told: list[tuple[Verdict, str, Mapping[str, Any]]] = []
        self.findings: list[Finding] = []
        self.rows: list[tuple[Cell, ...]] = []
        self.figures: list[HistogramFigure] = []
        self.outside: int | None = None
        self.explained: float | None = None
        self.inside: Moved | None = None


def check(model: FittedModel) -> CheckResult:
    """Overlap of the exposure's groups by the preference score; of a number, the variance that adjustment leaves it.

    The exposure's odds ratio is fitted again without the records outside the overlap (Crump et al. 2009, Biometrika
    96:187-199, on leaving them out; Petersen et al. 2012, Stat Methods Med Res 21:31-54, on what lack of overlap does).
    """
    gathered = _Gathered()
    for exposure in model.exposures:
        others = [c for c in model.design.columns if c.kind != "intercept" and exposure not in c.sources]
        if not others:
            gathered.told.append(("not applicable", "overlap-nothing-adjusted", {}))
        elif model.columns[exposure].kind == "number":
            _number(model, exposure, gathered)
        else:
            _category(model, exposure, gathered)
    told = gathered.told or [("not applicable", "overlap-no-exposure", {})]
    verdict, code, facts = max(told, key=lambda one: _ORDER.index(one[0]))
    statistics: dict[str, float | int | None] = {
        "outside_records": gathered.outside,
        "exposure_variance_explained": gathered.explained,
        "exposure_odds_ratio_within_overlap": gathered.inside.after if gathered.inside else None,
    }
    told_by = {
        "outside_records": "overlap-no-category",
        "exposure_variance_explained": "overlap-no-number",
        "exposure_odds_ratio_within_overlap": "overlap-not-refitted" if gathered.outside else "overlap-none-outside",
    }
    line = say(code, **facts)
    return CheckResult(
        name="overlap",
        family="sparsity",
        title=say("overlap-title"),
        verdict=verdict,
        line=line,
        statistics=statistics,
        reasons={
            name: line if verdict == "not applicable" else say(told_by[name])
            for name, value in statistics.items()
            if value is None
        },
        findings=tuple(gathered.findings),
        tables=(_table(gathered.rows),) if gathered.rows else (),
        figures=tuple(gathered.figures),
        explanation=say("overlap-explanation"),
    )


def _number(model: FittedModel, exposure: str, gathered: _Gathered) -> None:
    explained = variation_explained(model, exposure)
    if explained is None:
        return
    facts = {"exposure": model.columns[exposure].label, "explained": explained}
    verdict: Verdict = "caution" if explained >= MOST else "look" if explained >= MUCH else "fine"
    gathered.told.append((verdict, "overlap-number-line", facts))
    gathered.explained = max(explained, gathered.explained or 0.0)
    if verdict != "fine":
        gathered.findings.append(finding("caution", "little-variation-left", **facts))


def _category(model: FittedModel, exposure: str, gathered: _Gathered) -> None:
    label = model.columns[exposure].label
    comparisons = [one for one in compare(model, exposure) if one is not None]
    if not comparisons:
        gathered.told.append(("not applicable", "overlap-not-fitted", {}))
        return
    outside = any(one.outside_records for one in comparisons)
    inside = _refitted(model, exposure, comparisons) if outside and model.at_maximum_likelihood else None
    worst = max(comparisons, key=lambda one: one.share)
    facts = {
        "group": f"{label}: {worst.level}",
        "other": worst.reference,
        "share": _told_share(worst),
        "any_outside": outside,
        "alone": any(one.alone for one in comparisons),
        "exposure": inside.label if inside else None,
        "before": inside.before if inside else None,
        "after": inside.after if inside else None,
    }
    far = inside is not None and inside.change >= MATTERS
    verdict: Verdict = "fine"
    if worst.share >= MANY or (far and worst.share >= SOME):
        verdict = "caution"
    elif worst.share >= SOME or far:
        verdict = "look"
    gathered.told.append((verdict, "overlap-line", facts))
    if verdict != "fine":
        gathered.findings.append(finding("caution", "little-overlap", **facts))
    gathered.outside = max(worst.outside_records, gathered.outside or 0)
    if inside and (gathered.inside is None or inside.change > gathered.inside.change):
        gathered.inside = inside
    for one in comparisons:
        gathered.rows.append((label, one.level, one.reference, one.records, one.outside_records, one.share))
        gathered.figures.append(_figure(f"overlap-{len(gathered.figures) + 1}", label, one))


def _refitted(model: FittedModel, exposure: str, comparisons: Sequence[Comparison]) -> Moved | None:
    """The exposure's odds ratio without the records outside the overlap; None where it has none there."""
    rows, _ = with_places(model, exposure)
    passes = made_once(rows, Inside(tuple(one.preference for one in comparisons)))
    start = model.fit.coefficients
    kept = list(range(start.size))
    coefficients = coefficients_near(passes, start, start.size)
    if coefficients is None:
        fit, kept = fit_kept(passes, start)
        if fit.status != "converged":
            return None
        coefficients = np.zeros(start.size)
        coefficients[kept] = fit.coefficients
    own = [i for i in kept if model.design.columns[i].sources == (exposure,)]
    return moved(model, coefficients, own)


def _told_share(one: Comparison) -> float:
    """The share outside the overlap in whole per cent; 0 for a few of the records, 1 for nearly all of them."""
    if one.outside_records < A_FEW:
        return 0.0
    return 1.0 if one.records - one.outside_records < A_FEW else round(one.share, 2)


def _figure(identity: str, label: str, one: Comparison) -> HistogramFigure:
    return HistogramFigure(
        id=identity,
        title=say("overlap-figure-title", group=f"{label}: {one.level}", other=one.reference),
        alt=say("overlap-figure-alt", group=one.level, other=one.reference),
        x_label=say("overlap-figure-axis", group=one.level),
        edges=tuple(np.linspace(0.0, 1.0, BINS + 1).tolist()),
        series=((one.level, one.at_level), (one.reference, one.at_reference)),
    )


def _table(rows: list[tuple[Cell, ...]]) -> Table:
    return Table(
        id="overlap",
        title=say("overlap-table"),
        columns=(
            TableColumn("exposure", say("form-heading-exposure")),
            TableColumn("level", say("form-heading-level")),
            TableColumn("reference", say("form-heading-against")),
            TableColumn("records", say("form-heading-records"), "count"),
            TableColumn("outside", say("form-heading-outside"), "count", part_of="records"),
            TableColumn("share", say("form-heading-share"), "percent", hidden_with=("outside",)),
        ),
        rows=tuple(rows),
    )
