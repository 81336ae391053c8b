"""Invented frames with the columns that formulas of the tests speak of, and the way from formula to design."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
import pytest

from oddsmodel.design.encoder import Design, build_design
from oddsmodel.design.formula import vet_formula
from oddsmodel.records.types import Column


def described(frame: pd.DataFrame, **changed: Mapping[str, Any]) -> dict[str, Column]:
    """Columns as the records floor describes them; the first level is the reference unless `changed` says otherwise."""
    found = {}
    for name in frame.columns:
        facts: dict[str, Any] = {"kind": "number"}
        if isinstance(frame[name].dtype, pd.CategoricalDtype):
            levels = tuple(str(level) for level in frame[name].cat.categories)
            facts = {"kind": "category", "levels": levels, "reference": levels[0]}
        facts |= {"label": str(name).capitalize()} | dict(changed.get(str(name), {}))
        found[str(name)] = Column(str(name), **facts)
    return found


@dataclass(frozen=True)
class Study:
    """A frame with its columns, and the designs of formulas on it."""

    frame: pd.DataFrame
    columns: Mapping[str, Column]

    def design(self, formula: str, exposures: Sequence[str] = (), counts: Any = None) -> Design:
        vetted = vet_formula(formula, columns=self.columns, outcome="died", where="formula")
        return build_design(vetted, self.frame, self.columns, exposures, counts)

    def matrix(self, formula: str, counts: Any = None) -> np.ndarray:
        return self.design(formula, counts=counts).encode(self.frame)


@pytest.fixture
def study_of() -> Callable[..., Study]:
    """A study of any frame."""

    def made(frame: pd.DataFrame, **changed: Mapping[str, Any]) -> Study:
        return Study(frame, described(frame, **changed))

    return made


@pytest.fixture
def clinic() -> Study:
    """90 invented visits."""
    random = np.random.default_rng(20261201)
    n = 90
    frame = pd.DataFrame(
        {
            "age": random.integers(20, 90, n).astype(float),
            "bmi": random.gamma(25.0, 1.0, n).round(1),
            "visits": random.integers(1, 5, n).astype(float),
            "smoking": pd.Categorical(random.choice(["never", "former", "current"], n), ["never", "former", "current"]),
            "sex": pd.Categorical(random.choice(["female", "male"], n), ["female", "male"]),
            "ward": pd.Categorical(random.choice(["a", "b", "c", "d"], n), ["a", "b", "c", "d"], ordered=True),
        }
    )
    columns = described(
        frame,
        age={"units": "years", "per": 10.0, "label": "Age"},
        bmi={"units": "kg/m²", "label": "Body mass index"},
        ward={"kind": "ordered"},
    )
    return Study(frame, columns)
