"""One block of records: who belongs to which model, and the columns that models and measures will ask for."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from oddsmodel.model.rows import COLUMN
from oddsmodel.passes import Leaf
from oddsmodel.plan.schema import StudyPlan
from oddsmodel.records.accounting import Tally, tally
from oddsmodel.records.outcome import CodedOutcome
from oddsmodel.records.stream import RecordStream
from oddsmodel.records.types import Records
from oddsmodel.study.prepare import VettedModels, conditions

Mask = NDArray[np.bool_]
NOBODY: Mask = np.zeros(0, dtype=np.bool_)


@dataclass(frozen=True)
class Gathered:
    """rows: arrays of the rows that any model or measure may ask for. tallies: of each model, over all rows."""

    rows: Leaf
    tallies: tuple[Tally, ...]


@dataclass(frozen=True)
class Gather:
    """What is gathered from each block of a stream; goes to workers as it is.

    columns: the record columns that are kept, numbers and those with levels.
    """

    stream: RecordStream
    plan: StudyPlan
    vetted: VettedModels
    columns: tuple[str, ...]

    @property
    def populations(self) -> tuple[tuple[str, ...], ...]:
        """The different study populations of the models, by their conditions."""
        return tuple(dict.fromkeys(tuple(conditions(self.plan, one.section)) for one in self.vetted.models))

    def population_of(self, model: int) -> int:
        """The study population of a model, by its number."""
        return self.populations.index(tuple(conditions(self.plan, self.vetted.models[model].section)))

    @property
    def shared(self) -> int | None:
        """The first of the models that share their records."""
        models = enumerate(self.vetted.models)
        return next((number for number, one in models if one.section.same_records), None)

    def __call__(self, number: int) -> Gathered:
        records = self.stream.block(number)
        outcome = self.stream.outcome_of(records)
        rows: Leaf = {}
        wanted = np.zeros(len(records.frame), dtype=np.bool_)
        for place, keep in enumerate(self.populations):
            kept = tally(records, outcome, keep=keep, exposures=(), adjustment=()).included
            rows[f"kept:{place}"] = kept
            wanted |= kept
        tallies = self._models(records, outcome, rows)
        if self.plan.outcome.start is not None:
            wanted |= self._followed(records, outcome, rows)
        rows["event"] = outcome.event
        if records.counts is not None:
            rows["count"] = records.counts.to_numpy(dtype=np.float64)
        for name in self.columns:
            rows[COLUMN + name] = _array(records, name)
        return Gathered({name: array[wanted] for name, array in rows.items()}, tuple(tallies))

    def _models(self, records: Records, outcome: CodedOutcome, rows: Leaf) -> list[Tally]:
        tallies = []
        for number, model in enumerate(self.vetted.models):
            exposures = model.section.exposures
            found = tally(
                records,
                outcome,
                keep=conditions(self.plan, model.section),
                exposures=exposures,
                adjustment=[name for name in self.vetted.needed(number) if name not in exposures],
            )
            rows[f"analysed:{number}"] = found.included
            tallies.append(replace(found, included=NOBODY))
        for number, model in enumerate(self.vetted.models):
            if self.shared is not None and not model.section.same_records:
                rows[f"both:{number}"] = rows[f"analysed:{number}"] & rows[f"analysed:{self.shared}"]
        return tallies

    def _followed(self, records: Records, outcome: CodedOutcome, rows: Leaf) -> Mask:
        """Marks those whose window could have finished, and those complete but for the outcome."""
        known = replace(outcome, recorded=np.ones_like(outcome.recorded))
        wanted = np.zeros(len(records.frame), dtype=np.bool_)
        rows["recorded"] = outcome.recorded
        for place, keep in enumerate(self.populations):
            followed = tally(records, known, keep=keep, exposures=(), adjustment=()).included
            rows[f"followed:{place}"] = followed
            wanted |= followed
        for number, model in enumerate(self.vetted.models):
            complete = tally(
                records,
                known,
                keep=conditions(self.plan, model.section),
                exposures=model.section.exposures,
                adjustment=self.vetted.needed(number),
            )
            rows[f"complete:{number}"] = complete.included
        return wanted


def _array(records: Records, name: str) -> NDArray[Any]:
    values = records.frame[name]
    if records.columns[name].kind == "number":
        return values.to_numpy(dtype=np.float64)
    return np.asarray(values.cat.codes)
