"""A fitted model whose records belong to groups."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pandas as pd
from form_models import fitted

from oddsmodel.model.fitted import FittedModel, Held
from oddsmodel.model.grouped import grouping
from oddsmodel.model.in_memory import rows_with_index


def grouped(formula: str = "x + z", n: int = 240, groups: int = 40) -> FittedModel:
    """n records of two numbers, x and z, in so many groups that differ in their risk."""
    rng = np.random.default_rng(2)
    frame = pd.DataFrame({"x": np.round(rng.normal(size=n), 1), "z": np.round(rng.normal(size=n), 1)})
    who = rng.integers(0, groups, n)
    event = rng.random(n) < 1 / (1 + np.exp(-(0.8 * frame["x"] + rng.normal(size=groups)[who])))
    model = fitted(formula, frame, event, ["x"])
    rows, patterns = rows_with_index(frame, event.to_numpy(), None, model.design, ["x", "z"])
    held = Held(frame, event.to_numpy(), None, patterns)
    made = grouping("who", "Who", pd.Series(who), held.event, None, model.design, patterns, model.fit)
    return replace(model, rows=rows, held=held, grouping=made)
