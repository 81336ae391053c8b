"""Specification stability: the exposure's odds ratio over all subsets of the adjustment columns."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.exposure import LARGEST_LOG
from oddsmodel.checks.subsets import WHOLE, fit_subsets, subsets_of
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.figures import SpreadFigure
from oddsmodel.results.study import CheckResult
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say

FEWEST_COLUMNS = 2
MOST_DRAWN = 4
"""Pictures of so many exposure columns at most, those whose odds ratio spreads most."""


@dataclass(frozen=True)
class Choices:
    """The odds ratios of one exposure column: as reported, without any adjustment, and with each other choice of
    columns that gave one; without (m,): with each adjustment column left out alone."""

    position: int
    label: str
    reported: float
    alone: float | None
    others: tuple[float, ...]
    without: tuple[float | None, ...]

    @property
    def adjusted(self) -> list[float]:
        """All but the one without any adjustment, rising."""
        return sorted((self.reported, *self.others))

    @property
    def width(self) -> float:
        return self.adjusted[-1] / self.adjusted[0]


def check(model: FittedModel) -> CheckResult:
    """The exposure's odds ratio under every choice of adjustment columns, or 1000 drawn with equal chance of more than
    2^10; and with each left out alone. A column left out takes every term that it is part of along."""
    reason = _none(model)
    spreads = _spreads(model) if reason is None else []
    if reason is None and not spreads:
        reason = say("stability-no-odds-ratio")
    m = len(model.adjustment)
    widest = max(spreads, key=lambda one: one.width, default=None)
    statistics: dict[str, float | int | None] = {
        "choices": len(widest.adjusted) if widest else None,
        "smallest_odds_ratio": widest.adjusted[0] if widest else None,
        "largest_odds_ratio": widest.adjusted[-1] if widest else None,
    }
    drawn = sorted(spreads, key=lambda one: -one.width)[:MOST_DRAWN]
    return CheckResult(
        name="specification_stability",
        family="functional form",
        title=say("stability-title"),
        verdict="fine" if spreads else "not applicable",
        line="",
        statistics=statistics,
        reasons={name: reason or "" for name, value in statistics.items() if value is None},
        tables=(_range_table(spreads), _without_table(model, spreads)) if spreads else (),
        figures=tuple(_figure(one) for one in spreads if one in drawn),
        explanation=say("stability-explanation", columns=m, sampled=m > WHOLE, whole=WHOLE),
    )


def _none(model: FittedModel) -> str | None:
    """Why there is nothing to compare, if so."""
    if len(model.adjustment) < FEWEST_COLUMNS:
        return say("stability-few-columns")
    if not any(model.design.columns[i].shown for i in model.exposure_indices):
        return say("stability-no-odds-ratio")
    return None


def _spreads(model: FittedModel) -> list[Choices]:
    m = len(model.adjustment)
    kept = subsets_of(model)
    fits = fit_subsets(model, np.concatenate([kept[1:], ~np.eye(m, dtype=bool)]))
    alone, others, without = fits[0], fits[1 : len(kept) - 1], fits[len(kept) - 1 :]
    found: list[Choices] = []
    for i in model.exposure_indices:
        column = model.design.columns[i]
        reported = _ratio(model, model.fit.coefficients, i)
        if not column.shown or reported is None:
            continue
        told = tuple(ratio for one in others if (ratio := _ratio(model, one, i)) is not None)
        left_out = tuple(_ratio(model, one, i) for one in without)
        found.append(Choices(i, column.label, reported, _ratio(model, alone, i), told, left_out))
    return found


def _ratio(model: FittedModel, coefficients: Array | None, position: int) -> float | None:
    if coefficients is None:
        return None
    log = float(coefficients[position]) * model.design.columns[position].per
    return math.exp(log) if abs(log) <= LARGEST_LOG else None


def _range_table(spreads: list[Choices]) -> Table:
    columns = (
        TableColumn("exposure", say("form-heading-exposure")),
        TableColumn("choices", say("stability-choices"), "number"),
        TableColumn("reported", say("stability-reported"), "odds_ratio"),
        TableColumn("smallest", say("stability-smallest"), "odds_ratio"),
        TableColumn("median", say("stability-median"), "odds_ratio"),
        TableColumn("largest", say("stability-largest"), "odds_ratio"),
    )
    rows: list[tuple[Cell, ...]] = []
    for one in spreads:
        found = one.adjusted
        middle = math.exp(float(np.median(np.log(found))))
        rows.append((one.label, len(found), one.reported, found[0], middle, found[-1]))
    return Table(
        "specification_stability", say("stability-range"), columns, tuple(rows), say("stability-not-uncertainty")
    )


def _without_table(model: FittedModel, spreads: list[Choices]) -> Table:
    columns = [TableColumn("left_out", say("stability-left-out"))]
    columns += [TableColumn(f"odds_ratio_{one.position}", one.label, "odds_ratio") for one in spreads]
    rows: list[tuple[Cell, ...]] = [(say("stability-nothing-left-out"), *(one.reported for one in spreads))]
    for k, name in enumerate(model.adjustment):
        label = model.columns[name].label if name in model.columns else name
        rows.append((label, *(one.without[k] for one in spreads)))
    return Table("without_one_column", say("stability-without"), tuple(columns), tuple(rows))


def _figure(one: Choices) -> SpreadFigure:
    found = one.adjusted if one.alone is None else sorted((*one.adjusted, one.alone))
    return SpreadFigure(
        id=f"stability-{one.position}",
        title=say("stability-figure-title", label=one.label),
        alt=say(
            "stability-figure-alt",
            label=one.label,
            choices=len(one.adjusted),
            smallest=one.adjusted[0],
            largest=one.adjusted[-1],
        ),
        estimates=tuple(found),
        reported=one.reported,
        alone=one.alone,
    )
