"""The fitted model that measures and checks read."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy.special import expit

from oddsmodel.design.encoder import Design
from oddsmodel.design.patterns import Patterns
from oddsmodel.inference.maximise import Fit, maximise
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.grouped import Grouping
from oddsmodel.records.types import Column

Array = NDArray[np.float64]


@dataclass(frozen=True)
class FittedModel:
    """A converged maximum-likelihood fit and everything it was made from.

    frame, event, counts: the analysed records in source order: coded columns, whether the event happened (n,),
        true frequencies (n,) or None where every row is one record.
    patterns: the covariate patterns of the model matrix (m of them): X (m, p), events (m,), trials (m,),
        index (n,) from row to pattern, first_row (m,) from pattern to a row of the frame.
    study_design, aim: as the plan says them ("cohort", "case-control", ...; "association", "prediction").
    exposures, adjustment: the record columns in either role. also: the checks the plan asks for.
    grouping: the groups that the records belong to, where they are not independent; there is then no likelihood of the
        records, and no test, limit or criterion that rests on one.
    """

    name: str
    study_design: str
    aim: str
    level: float
    design: Design
    frame: pd.DataFrame
    columns: Mapping[str, Column]
    event: NDArray[np.bool_]
    counts: Array | None
    patterns: Patterns
    likelihood: BinomialLikelihood
    fit: Fit
    exposures: tuple[str, ...]
    adjustment: tuple[str, ...]
    also: tuple[str, ...] = ()
    seed: int = 20260101
    grouping: Grouping | None = None

    @cached_property
    def fitted(self) -> Array:
        """Fitted probabilities of the patterns (m,)."""
        return np.asarray(expit(self.patterns.X @ self.fit.coefficients))

    @property
    def records(self) -> int:
        """Number of records analysed (the sum of counts where there are any)."""
        return round(float(self.patterns.trials.sum()))

    @property
    def events(self) -> int:
        return round(float(self.patterns.events.sum()))

    @property
    def exposure_indices(self) -> tuple[int, ...]:
        """Positions of the exposure's columns in the model matrix."""
        return tuple(i for i, column in enumerate(self.design.columns) if column.role == "exposure")

    def refit(self, X: Array) -> Fit:
        """The fit of another matrix (m, q) to the same patterns' outcomes."""
        return maximise(BinomialLikelihood(X, self.patterns.events, trials=self.patterns.trials))
