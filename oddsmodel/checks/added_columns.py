"""Columns made from a fit and set beside it: the sums that score tests of them need, in two passes."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from oddsmodel.inference.tests import chi_square_p
from oddsmodel.likelihood.logistic import logistic
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import Leaf
from oddsmodel.passes.base import cut
from oddsmodel.wording import say

Array = NDArray[np.float64]

ALIASED = 1e-10
"""Share of a column's weighted sum of squares that the model's own columns must leave over."""

DEPENDENT = 1e-8
"""Eigenvalue of the correlations of what is left over below which a direction tells nothing of its own."""

HEAVIEST = 2.0
"""Excess kurtosis up to which a sum counts as near normal: its square then has at most twice a chi-square's
variance."""

RARER_A_COLUMN = 4
"""Records with the rarer outcome that there must be for each coefficient and added column: with fewer, simulations
found levels of 5% and 1% exceeded by more than half."""


@dataclass(frozen=True)
class FittedRows:
    """Rows that stand for a record, at the fit.

    X (m, p): as the model has it. linear (m,): the linear predictor. probability, complement (m,): p and 1 − p, each
    without loss. trials (m,). variance (m,): trials·p·(1 − p).
    """

    X: Array
    linear: Array
    probability: Array
    complement: Array
    trials: Array
    variance: Array

    @property
    def lean(self) -> Array:
        """1 − 2p (m,)."""
        return self.complement - self.probability


class Maker(Protocol):
    """Makes columns (m, k) of rows at the fit; can be pickled."""

    def __call__(self, rows: FittedRows) -> Array: ...


@dataclass(frozen=True)
class AtFit:
    """What is needed to see rows at a fit. inverse (p, p): of the information in working coordinates, from which
    to_beta (p, p) leads to the coefficients; None where they are the coefficients."""

    coefficients: Array
    inverse: Array
    to_beta: Array | None

    @classmethod
    def of(cls, model: FittedModel) -> AtFit:
        fit = model.fit
        inverse = np.asarray(np.linalg.inv(fit.working_information), dtype=np.float64)
        return cls(fit.coefficients, inverse, fit.space.to_beta)

    def working(self, X: Array) -> Array:
        """The model's columns in working coordinates."""
        return X if self.to_beta is None else np.asarray(X @ self.to_beta)

    def rows(self, rows: Leaf) -> FittedRows:
        """All rows at the fit, also those of no record."""
        linear = rows["X"] @ self.coefficients
        small, whole, probability = logistic(linear)
        complement = np.maximum(small, linear < 0.0) / whole
        trials = rows["trials"] if "trials" in rows else np.ones_like(linear)
        return FittedRows(rows["X"], linear, probability, complement, trials, trials * probability * complement)


@dataclass(frozen=True)
class _Products:
    """X'VZ (p, k), in working coordinates, and the diagonal of Z'VZ (k,)."""

    at: AtFit
    makers: tuple[Maker, ...]

    def leaf(self, rows: Leaf, state: None) -> tuple[Array, Array]:
        fitted, _ = _of_records(self.at, rows)
        with np.errstate(all="ignore"):
            made = columns_of(self.makers, fitted)
            weighted = fitted.variance[:, None] * made
            return self.at.working(fitted.X).T @ weighted, (made * weighted).sum(axis=0)


@dataclass(frozen=True)
class _Sums:
    """The sums over R = Z − X B with B (p, k) the state: see `AddedColumns`."""

    at: AtFit
    makers: tuple[Maker, ...]

    def leaf(self, rows: Leaf, weights: Array) -> tuple[Array, ...]:
        fitted, events = _of_records(self.at, rows)
        own = self.at.working(fitted.X)
        leverage = fitted.variance * np.einsum("ij,ij->i", own @ self.at.inverse, own)
        raw = events * fitted.complement - (fitted.trials - events) * fitted.probability
        with np.errstate(all="ignore"):
            left = columns_of(self.makers, fitted) - own @ weights
            weighted = fitted.variance[:, None] * left
            fourth = fitted.variance * (1.0 - 6.0 * fitted.probability * fitted.complement)
            return (
                left.T @ raw,
                left.T @ weighted,
                fourth @ (left * left) ** 2,
                (fitted.lean * leverage) @ left,
                np.array([(leverage * (1.0 - 1.0 / fitted.trials)).sum(), (1.0 / fitted.trials).sum()]),
            )


def _of_records(at: AtFit, rows: Leaf) -> tuple[FittedRows, Array]:
    """The rows that stand for a record, at the fit, and their events."""
    if "trials" in rows and not rows["trials"].all():
        rows = cut(rows, np.flatnonzero(rows["trials"]))
    return at.rows(rows), rows["events"]


def columns_of(makers: tuple[Maker, ...], rows: FittedRows) -> Array:
    """All columns (m, k) side by side."""
    return np.hstack([maker(rows) for maker in makers])


@dataclass(frozen=True)
class AddedColumns:
    """Sums for k added columns Z. R = Z − X B is what the model's columns leave over of them, by weighted regression.

    places: of the columns by name. weights (p, k): B, in working coordinates. score (k,): R'(y − np). information
    (k, k): R'VR with V = diag np(1 − p). size (k,): the diagonal of Z'VZ. fourth (k,): sums of the fourth cumulants of
    what each row adds to the score. tilt (k,): R'((1 − 2p)h), h the leverages. taken, inverse_trials: sums of
    h(1 − 1/n) and of 1/n. rarer: records with the rarer outcome.
    """

    at: AtFit
    makers: Mapping[str, Maker]
    places: Mapping[str, slice]
    weights: Array
    score: Array
    information: Array
    size: Array
    fourth: Array
    tilt: Array
    taken: float
    inverse_trials: float
    rarer: int

    @property
    def parameters(self) -> int:
        return len(self.weights)

    def usable(self, name: str) -> tuple[NDArray[np.int64], str]:
        """Positions of the columns under a name that can be tested, and why, where none can."""
        places = np.arange(self.score.size)[self.places[name]]
        own = np.diag(self.information)[places]
        known = np.isfinite(own) & np.isfinite(self.score[places]) & np.isfinite(self.fourth[places])
        apart = known & (own > ALIASED * self.size[places])
        with np.errstate(all="ignore"):
            normal = apart & (np.abs(self.fourth[places] / own**2) <= HEAVIEST)
        if normal.any():
            return places[normal], ""
        return places[normal], say("goodness-edge" if apart.any() or not known.all() else "goodness-nothing-left")

    def enough(self, columns: int) -> bool:
        """Whether the records are enough for a test of so many columns."""
        return self.rarer >= RARER_A_COLUMN * (self.parameters + columns)

    def too_few(self) -> str:
        """The reason where they are not."""
        return say("goodness-few-events", least=RARER_A_COLUMN)


class FitTest(NamedTuple):
    """A chi-square statistic with its degrees of freedom and p; None, with the reason, where there is none.

    score: the standardised sum itself, where there is one degree of freedom. distance: how many standard errors the
    records are off, with what chance adds taken away; None where the statistic is not of a shift of the linear
    predictors.
    """

    statistic: float | None
    df: int | None
    p: float | None
    reason: str = ""
    score: float | None = None
    distance: float | None = None


def withheld(reason: str) -> FitTest:
    """No test."""
    return FitTest(None, None, None, reason)


def add_columns(model: FittedModel, columns: Mapping[str, tuple[Maker, int]]) -> AddedColumns:
    """The sums for some columns: by name what makes them, and how many it makes. Two passes over the rows."""
    makers = {name: maker for name, (maker, _) in columns.items()}
    widths = {name: width for name, (_, width) in columns.items()}
    at, every = AtFit.of(model), tuple(makers.values())
    passes = model.rows.passes
    products, size = passes.reduce([_Products(at, every)], None)[0]
    with np.errstate(all="ignore"):
        weights = at.inverse @ products
    sums = passes.reduce([_Sums(at, every)], weights)[0]
    ends = np.cumsum([widths[name] for name in makers]).tolist()
    return AddedColumns(
        at=at,
        makers=makers,
        places={name: slice(end - widths[name], end) for name, end in zip(makers, ends, strict=True)},
        weights=weights,
        score=sums[0],
        information=sums[1],
        size=size,
        fourth=sums[2],
        tilt=sums[3],
        taken=float(sums[4][0]),
        inverse_trials=float(sums[4][1]),
        rarer=min(model.events, model.records - model.events),
    )


def score_test(added: AddedColumns, name: str) -> FitTest:
    """Rao's score test of the columns under a name: U'V^-1 U with U the score and V the information left over.

    Columns that the model already has, or whose sum rests on too few records to be near normal, are left out; the
    degrees of freedom are those of the rest.
    """
    places, reason = added.usable(name)
    if reason:
        return withheld(reason)
    own = added.information[np.ix_(places, places)]
    scale = np.sqrt(np.diag(own))
    values, vectors = np.linalg.eigh(own / np.outer(scale, scale))
    kept = values > DEPENDENT
    df = int(np.count_nonzero(kept))
    if not added.enough(df):
        return withheld(added.too_few())
    standard = (vectors.T @ (added.score[places] / scale))[kept] / np.sqrt(values[kept])
    statistic = float(standard @ standard)
    single = float(added.score[places[0]] / scale[0]) if places.size == 1 else None
    return FitTest(statistic, df, chi_square_p(statistic, df), score=single, distance=distance_of(statistic, df))


def distance_of(statistic: float, df: int) -> float:
    """The root of what a chi-square statistic is above its mean where the model holds."""
    return math.sqrt(max(0.0, statistic - df))
