"""Tables and figure of the influence check, fit for disclosure control."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.deletion import Deletion
from oddsmodel.checks.one_step import OneStep, ranked
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.measures.scale import exponential
from oddsmodel.model.fitted import FittedModel
from oddsmodel.randomness import generator
from oddsmodel.results.figures import ScatterFigure
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say
from oddsmodel.wording.plain import plain

TOP_POINTS = 500
SAMPLED_POINTS = 1500
LONGEST_PATTERN = 300
BOTH = ("records", "events")


def deletions_table(model: FittedModel, deletions: Sequence[Deletion]) -> Table:
    """The exposure's odds ratios from the exact fits without the most influential patterns."""
    shown = [i for i in model.exposure_indices if model.design.columns[i].shown]
    columns = (
        TableColumn("patterns", "Covariate patterns left out"),
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
    return Table("without_influential_patterns", say("influence-deletions-title"), columns, tuple(rows), note)


def _odds_ratios(model: FittedModel, coefficients: NDArray[np.float64], shown: Sequence[int]) -> list[float | None]:
    return [exponential(float(coefficients[i]) * model.design.columns[i].per) for i in shown]


def patterns_table(model: FittedModel, steps: OneStep, top: NDArray[np.int64], targets: tuple[int, ...]) -> Table:
    """The patterns that move the exposure most, one a row; everything in a row hides with its counts."""
    shown = [(place, i) for place, i in enumerate(targets) if model.design.columns[i].shown]
    leading = max(shown, key=lambda pair: float(np.abs(steps.change[top, pair[0]]).max()), default=None)
    risk = model.study_design in QUANTITY
    columns = [
        TableColumn("pattern", "Covariate pattern", hidden_with=BOTH),
        TableColumn("records", "Records", "count"),
        TableColumn("events", "Events" if risk else "Cases", "count", part_of="records"),
    ]
    numbers = {
        "leverage": ("Leverage", steps.leverage),
        "delta_chi_square": ("Fall in Pearson chi-square without it", steps.delta_chi_square),
        "delta_deviance": ("Fall in deviance without it", steps.delta_deviance),
        "distance": ("Standardised shift of all coefficients", steps.distance),
    }
    if risk:
        numbers = {"expected_per_100": ("Expected per 100", 100.0 * steps.probability), **numbers}
    columns += [TableColumn(key, heading, "number", hidden_with=BOTH) for key, (heading, _) in numbers.items()]
    if leading is not None:
        label = model.design.columns[leading[1]].label
        heading = say("influence-one-step-heading", label=label)
        columns.append(TableColumn("odds_ratio", heading, "odds_ratio", hidden_with=BOTH))
    words = _patterns_in_words(model, top)
    rows: list[tuple[Cell, ...]] = []
    for word, j in zip(words, top.tolist(), strict=True):
        alone = bool(steps.alone[j])
        row: list[Cell] = [word, round(float(model.patterns.trials[j])), round(float(model.patterns.events[j]))]
        row += [
            None if alone and key not in ("leverage", "expected_per_100") else float(values[j])
            for key, (_, values) in numbers.items()
        ]
        if leading is not None:
            place, i = leading
            moved = float(model.fit.coefficients[i] + steps.change[j, place]) * model.design.columns[i].per
            row.append(None if alone else exponential(moved))
        rows.append(tuple(row))
    note = say("influence-alone") if bool(steps.alone[top].any()) else ""
    return Table("influential_patterns", say("influence-patterns-title"), tuple(columns), tuple(rows), note)


def _patterns_in_words(model: FittedModel, top: NDArray[np.int64]) -> list[str]:
    """The values of the record columns in each pattern; a column whose value differs within it says only that.

    A pattern of the model matrix may hold records of several values of a column that the formula cuts into
    bands; the first record's own value is nobody's business.
    """
    sources = list(dict.fromkeys(source for column in model.design.columns for source in column.sources))
    place = np.full(model.patterns.trials.size, -1)
    place[top] = np.arange(top.size)
    rows = np.flatnonzero(place[model.patterns.index] >= 0)
    part = model.frame[sources].iloc[rows]
    belongs = place[model.patterns.index[rows]]
    words: list[str] = []
    for j in range(top.size):
        own = part[belongs == j]
        values = []
        for source in sources:
            found = own[source].unique()
            value = _in_words(found[0]) if len(found) == 1 else "several values"
            values.append(f"{model.columns[source].label}: {value}")
        words.append(plain(", ".join(values), LONGEST_PATTERN))
    return words


def _in_words(value: object) -> str:
    return f"{value:g}" if isinstance(value, float | np.floating) else str(value)


def scatter(model: FittedModel, steps: OneStep) -> ScatterFigure:
    """Fall in deviance against fitted probability, a point a pattern, its size the shift of the coefficients.

    Of more than 2,000 patterns, the 500 that shift the coefficients most and a random sample of the others.
    """
    usable = np.flatnonzero(~steps.alone & (model.patterns.trials > 0.0))
    sampled = usable.size > TOP_POINTS + SAMPLED_POINTS
    if sampled:
        top = usable[ranked(steps.distance[usable], TOP_POINTS)]
        rest = np.setdiff1d(usable, top, assume_unique=True)
        random = generator(model.seed, "influence figure", model.name)
        usable = np.sort(np.concatenate([top, random.choice(rest, SAMPLED_POINTS, replace=False)]))
    return ScatterFigure(
        id="influence",
        title=say("influence-title"),
        alt=say(
            "influence-alt", patterns=int((model.patterns.trials > 0.0).sum()), drawn=int(usable.size), sampled=sampled
        ),
        x_label=say("influence-axis" if model.study_design in QUANTITY else "influence-axis-cases"),
        y_label="Fall in deviance without the pattern",
        x=tuple(steps.probability[usable].tolist()),
        y=tuple(steps.delta_deviance[usable].tolist()),
        size=tuple(steps.distance[usable].tolist()),
        records=tuple(round(count) for count in model.patterns.trials[usable].tolist()),
    )
