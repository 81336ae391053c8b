"""The fitted model that measures and checks read."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.encoder import Design
from oddsmodel.design.patterns import Patterns
from oddsmodel.inference.maximise import Fit
from oddsmodel.inference.penalised import PenalisedFit
from oddsmodel.likelihood.base import Likelihood
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.grouped import Grouping
from oddsmodel.model.kept import People
from oddsmodel.model.rows import ModelRows
from oddsmodel.plan.schema import Method
from oddsmodel.records.types import Column

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Held:
    """Records in memory: coded columns (n rows), whether the event happened (n,), true frequencies (n,) or None.

    patterns: their covariate patterns, with the pattern of each record, where the records belong to groups.
    """

    frame: pd.DataFrame
    event: NDArray[np.bool_]
    counts: Array | None
    patterns: Patterns | None = None


@dataclass(frozen=True)
class FittedModel:
    """A fit, as a rule a converged one by maximum likelihood, and everything it was made from.

    rows: the rows of the model matrix, covariate patterns or single records, wherever they are.
    people: the records analysed, to be counted by the values of columns. records, events: how many they are.
    held: the records in memory; None where they are not in memory.
    study_design, aim: as the plan says them ("cohort", "case-control", ...; "association", "prediction").
    exposures, adjustment: the record columns in either role. also: the checks the plan asks for.
    likelihood: what was maximised; by another method than maximum likelihood with a penalty or a prior.
    penalised: the penalised fit, with another maximum if there is one, where that is the method.
    grouping: the groups that the records belong to, where they are not independent; there is then no likelihood of the
        records, and no test, limit or criterion that rests on one.
    """

    name: str
    study_design: str
    aim: str
    level: float
    design: Design
    columns: Mapping[str, Column]
    rows: ModelRows
    people: People
    records: int
    events: int
    likelihood: Likelihood
    fit: Fit
    exposures: tuple[str, ...]
    adjustment: tuple[str, ...]
    also: tuple[str, ...] = ()
    seed: int = 20260101
    grouping: Grouping | None = None
    held: Held | None = None
    method: Method = "maximum likelihood"
    penalised: PenalisedFit | None = None

    @property
    def binomial(self) -> BinomialLikelihood:
        """The binomial likelihood of the rows, without any penalty or prior."""
        return BinomialLikelihood.over(self.rows.passes, len(self.design.columns))

    @property
    def at_maximum_likelihood(self) -> bool:
        """Whether the fit is a finite maximum of the likelihood, as checks of fit take it to be."""
        return self.method == "maximum likelihood" and self.fit.status == "converged"

    @property
    def exposure_indices(self) -> tuple[int, ...]:
        """Positions of the exposure's columns in the model matrix."""
        return tuple(i for i, column in enumerate(self.design.columns) if column.role == "exposure")

    @property
    def grouped(self) -> tuple[Held, Patterns]:
        """The records in memory with their patterns, for what allows for groups."""
        if self.held is None or self.held.patterns is None:
            raise TypeError("records that belong to groups are held in memory with their patterns")
        return self.held, self.held.patterns
