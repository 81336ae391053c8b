"""The models of `form_models` with their records on disk, and with rows that are records where patterns are many."""

from __future__ import annotations

import pickle
from collections.abc import Iterator, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from form_models import fitted

from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model import rows as model_rows
from oddsmodel.model.counted import CountedPeople
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import Kernel, Made, MemoryPasses, Work
from oddsmodel.passes.files import ColumnWriter
from oddsmodel.passes.local import LocalPasses


class Sent(LocalPasses):
    """Passes whose kernels, work and makers go by way of bytes, as to a worker."""

    def reduce(self, kernels: Sequence[Kernel], state: Any) -> list[Any]:
        return super().reduce(again(list(kernels)), again(state))

    def each(self, work: Work, state: Any = None) -> Iterator[Any]:
        return super().each(again(work), again(state))

    def mapped(self, made: Made) -> LocalPasses:
        return Sent(self.source, (*self.makers, again(made)))


def again(sent: Any) -> Any:
    return pickle.loads(pickle.dumps(sent))


def single_rows(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let rows be records whatever the patterns."""
    monkeypatch.setattr(model_rows, "MOST_PATTERNS", 0)


def on_disk(model: FittedModel, folder: Path) -> FittedModel:
    """The same model, its records written to files and fitted from there."""
    people = model.rows.people
    assert isinstance(people, MemoryPasses)
    writer = ColumnWriter(folder)
    for first in range(0, people.rows, 50_000):
        writer.write({name: array[first : first + 50_000] for name, array in people.arrays.items()})
    passes = Sent(writer.close())
    rows = model_rows.rows_of(passes, model.design, model.rows.levels)
    likelihood = BinomialLikelihood.over(rows.passes, len(model.design.columns))
    counted = CountedPeople(passes, model.rows.levels)
    return replace(model, rows=rows, people=counted, likelihood=likelihood, fit=maximise(likelihood), held=None)


def ward_records(n: int, seed: int = 7) -> tuple[pd.DataFrame, Any]:
    """n invented stays: exposure in three levels that age and ward foretell, a bend in age; and whether the event
    happened."""
    rng = np.random.default_rng(seed)
    age = rng.normal(60, 12, n)
    ward = rng.integers(0, 3, n)
    stay = np.exp(rng.normal(1.5, 0.6, n))
    pull = np.stack([np.zeros(n), -1.2 + 0.12 * (age - 60), -1.5 + 0.8 * (ward == 2)])
    exposure = (pull + rng.gumbel(size=(3, n))).argmax(axis=0)
    log_odds = -1.6 + 0.3 * exposure + 0.05 * (age - 60) + 0.3 * ((age - 60) / 12) ** 2 + 0.4 * np.log(stay)
    frame = pd.DataFrame(
        {
            "exposure": categories(exposure, ["none", "some", "much"]),
            "ward": categories(ward, ["medical", "surgical", "other"]),
            "age": age,
            "stay": stay,
        }
    )
    return frame, rng.random(n) < 1 / (1 + np.exp(-log_odds))


def categories(codes: Any, levels: Sequence[str]) -> pd.Categorical:
    return pd.Categorical.from_codes(codes, list(levels))


def ward_model(n: int, formula: str = "exposure + ward + age + log(stay)", **how: Any) -> FittedModel:
    frame, event = ward_records(n)
    return fitted(formula, frame, event, how.pop("exposures", ["exposure"]), **how)
