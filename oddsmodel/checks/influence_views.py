"""Tables and figure of the influence check, fit for disclosure control."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.deletion import Deletion
from oddsmodel.checks.one_pass import SAMPLED_POINTS, TOP_POINTS, KeptRows, OnePass
from oddsmodel.checks.one_step import ranked
from oddsmodel.checks.pattern_words import in_words
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.measures.scale import exponential
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.figures import ScatterFigure
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say

BOTH = ("records", "events")
MOST_RATIOS = 4


def deletions_table(model: FittedModel, deletions: Sequence[Deletion]) -> Table:
    """The exposure's odds ratios from the exact fits without the most influential patterns."""
    single = model.rows.single
    shown = [i for i in model.exposure_indices if model.design.columns[i].shown]
    columns = (
        TableColumn("patterns", say("influence-left-out", single=single)),
        TableColumn("records", "Records left out", "count"),
        *(
            TableColumn(f"odds_ratio_{i}", model.design.columns[i].label, "odds_ratio", hidden_with=("records",))
            for i in shown
        ),
    )
    rows: list[tuple[Cell, ...]] = [("none", None, *_odds_ratios(model, model.fit.coefficients, shown))]
    for one in deletions:
        ratios = [None] * len(shown) if one.coefficients is None else _odds_ratios(model, one.coefficients, shown)
        rows.append((str(one.patterns), one.records, *ratios))
    lost = any(one.coefficients is None for one in deletions)
    note = say("influence-no-estimate") if lost else ""
    title = say("influence-deletions-title", single=single)
    return Table("without_influential_patterns", title, columns, tuple(rows), note)


def _odds_ratios(model: FittedModel, coefficients: NDArray[np.float64], shown: Sequence[int]) -> list[float | None]:
    return [exponential(float(coefficients[i]) * model.design.columns[i].per) for i in shown]


def patterns_table(model: FittedModel, top: KeptRows, targets: tuple[int, ...]) -> Table:
    """The patterns that move the exposure most, one a row; everything in a row hides with its counts.

    Leverage, residuals, one-step falls of either statistic, standardised shift and the odds ratios of the exposure's
    columns (of those that move most if there are more than `MOST_RATIOS`) are those of Pregibon 1981.
    """
    steps, single = top.steps, model.rows.single
    shown = [(place, i) for place, i in enumerate(targets) if model.design.columns[i].shown]
    furthest = [
        float(np.abs(steps.change[:, place]).max(initial=0.0)) * model.design.columns[i].per for place, i in shown
    ]
    kept = sorted(sorted(range(len(shown)), key=lambda one: -furthest[one])[:MOST_RATIOS])
    risk = model.study_design in QUANTITY
    pearson, deviance = _residuals(top)
    columns = [
        TableColumn("pattern", "Values" if single else "Covariate pattern", hidden_with=BOTH),
        TableColumn("records", "Records", "count"),
        TableColumn("events", "Events" if risk else "Cases", "count", part_of="records"),
    ]
    numbers = {
        "leverage": ("Leverage", steps.leverage),
        "pearson": ("Pearson residual", pearson),
        "deviance": ("Deviance residual", deviance),
        "delta_chi_square": ("Fall in Pearson chi-square without it", steps.delta_chi_square),
        "delta_deviance": ("Fall in deviance without it", steps.delta_deviance),
        "distance": ("Standardised shift of all coefficients", steps.distance),
    }
    if risk:
        numbers = {"expected_per_100": ("Expected per 100", 100.0 * steps.probability), **numbers}
    columns += [TableColumn(key, heading, "number", hidden_with=BOTH) for key, (heading, _) in numbers.items()]
    for one in kept:
        position = shown[one][1]
        heading = say("influence-one-step-heading", label=model.design.columns[position].label)
        columns.append(TableColumn(f"odds_ratio_{position}", heading, "odds_ratio", hidden_with=BOTH))
    rows: list[tuple[Cell, ...]] = []
    for j, word in enumerate(in_words(model, top.position)):
        alone = bool(steps.alone[j])
        row: list[Cell] = [word, round(float(top.trials[j])), round(float(top.events[j]))]
        row += [
            None if alone and key not in ("leverage", "expected_per_100") else float(values[j])
            for key, (_, values) in numbers.items()
        ]
        for place, i in (shown[one] for one in kept):
            moved = float(model.fit.coefficients[i] + steps.change[j, place]) * model.design.columns[i].per
            row.append(None if alone else exponential(moved))
        rows.append(tuple(row))
    note = say("influence-alone", single=single) if bool(steps.alone.any()) else ""
    title = say("influence-patterns-title", single=single)
    return Table("influential_patterns", title, tuple(columns), tuple(rows), note)


def _residuals(kept: KeptRows) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Pearson and deviance residuals (k,), with the sign of what was seen less what was expected.

    From r² = delta chi-square (1 − h) and d² = delta deviance − delta chi-square h.
    """
    steps = kept.steps
    sign = np.where(kept.events >= kept.trials * steps.probability, 1.0, -1.0)
    share = steps.delta_deviance - steps.delta_chi_square * steps.leverage
    pearson = sign * np.sqrt(steps.delta_chi_square * (1.0 - steps.leverage))
    return pearson, sign * np.sqrt(np.maximum(share, 0.0))


def scatter(model: FittedModel, seen: OnePass) -> ScatterFigure:
    """Fall in deviance against fitted probability, a point a pattern, its size the shift of the coefficients.

    Of more than 2,000 patterns, the 500 that shift the coefficients most and a random sample of the others.
    """
    usable = seen.kept.at(np.flatnonzero(~seen.kept.steps.alone))
    sampled = seen.sums.usable > TOP_POINTS + SAMPLED_POINTS
    if sampled:
        top = ranked(usable.steps.distance, TOP_POINTS)
        rest = np.setdiff1d(np.arange(usable.drawn.size), top, assume_unique=True)
        drawn = rest[np.argsort(usable.drawn[rest], kind="stable")[:SAMPLED_POINTS]]
        usable = usable.at(np.sort(np.concatenate([top, drawn])))
    single = model.rows.single
    facts = {"patterns": seen.sums.patterns, "drawn": int(usable.drawn.size), "sampled": sampled, "single": single}
    return ScatterFigure(
        id="influence",
        title=say("influence-title", single=single),
        alt=say("influence-alt", **facts),
        x_label=say("influence-axis" if model.study_design in QUANTITY else "influence-axis-cases"),
        y_label=say("influence-fall", single=single),
        x=tuple(usable.steps.probability.tolist()),
        y=tuple(usable.steps.delta_deviance.tolist()),
        size=tuple(usable.steps.distance.tolist()),
        records=tuple(round(count) for count in usable.trials.tolist()),
    )
