"""Which records' pattern leaves a model without a finite estimate, as far as one column alone tells it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference import Separation
from oddsmodel.measures.counts import exposure_counts, level_columns
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import Leaf

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Pattern:
    """without, always: levels, and products of levels, in which no record has the event, or every one.

    higher, lower: number columns whose values are higher, or lower, in every record with the event than in all others
    (or the same, at one value).
    """

    without: tuple[str, ...] = ()
    always: tuple[str, ...] = ()
    higher: tuple[str, ...] = ()
    lower: tuple[str, ...] = ()


def pattern_of(model: FittedModel, verdict: Separation) -> Pattern:
    """The columns that separate records by themselves, among those whose coefficient has no finite estimate."""
    columns = model.design.columns
    infinite = [position for position, kind in enumerate(verdict.coefficients) if kind != "finite"]
    found: dict[str, str] = {}
    sources = dict.fromkeys(columns[j].sources[0] for j in infinite if columns[j].kind == "level")
    for name in sources:
        counted = exposure_counts(model, name)
        if counted is not None and level_columns(model, name):
            for level, records, events in zip(counted.levels, counted.records, counted.events, strict=True):
                _judge(found, f"{model.columns[name].label}: {level}", int(records), int(events))
    products = [j for j in infinite if columns[j].kind == "interaction"]
    if products:
        sums = model.rows.passes.reduce([_AtOnes()], products)[0]
        for position, records, events, others in zip(products, *sums, strict=True):
            if not others:
                _judge(found, columns[position].label, round(float(records)), round(float(events)))
    numbers = [j for j in infinite if columns[j].kind == "number"]
    return Pattern(
        without=tuple(label for label, which in found.items() if which == "without"),
        always=tuple(label for label, which in found.items() if which == "always"),
        **_apart(model, numbers),
    )


def _judge(found: dict[str, str], label: str, records: int, events: int) -> None:
    if records and events in (0, records):
        found[label] = "always" if events else "without"


def _apart(model: FittedModel, numbers: Sequence[int]) -> dict[str, tuple[str, ...]]:
    if not numbers:
        return {}
    ends = np.stack(list(model.rows.passes.each(_ends, list(numbers))))
    (events_low, others_low), (events_high, others_high) = ends[:, 0].min(axis=0), ends[:, 1].max(axis=0)
    labels = [model.columns[model.design.columns[position].sources[0]].label for position in numbers]
    return {
        "higher": tuple(label for label, far in zip(labels, events_low >= others_high, strict=True) if far),
        "lower": tuple(label for label, far in zip(labels, events_high <= others_low, strict=True) if far),
    }


def _ends(rows: Leaf, first: int, columns: list[int]) -> Array:
    """The least and greatest values of some columns (k) in rows with events, and in rows with others: (2, 2, k)."""
    values, events = rows["X"][:, columns], rows["events"]
    sides = (events > 0.0, rows.get("trials", 1.0) - events > 0.0)
    least = [np.where(side[:, None], values, np.inf).min(axis=0) for side in sides]
    greatest = [np.where(side[:, None], values, -np.inf).max(axis=0) for side in sides]
    return np.array([least, greatest])


class _AtOnes:
    """Records and events where each of some columns is 1, and records where it is neither 0 nor 1."""

    def leaf(self, rows: Leaf, columns: list[int]) -> tuple[Array, Array, Array]:
        X = rows["X"][:, columns]
        trials = rows.get("trials", np.ones(len(X)))
        ones = (X == 1.0).astype(np.float64)
        return trials @ ones, rows["events"] @ ones, trials @ ((X != 0.0) & (X != 1.0)).astype(np.float64)
