"""A likelihood without a few of its rows, none of the others copied."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from oddsmodel.likelihood.base import Array, Evaluation
from oddsmodel.likelihood.binomial import BinomialLikelihood, triangle_of_rows
from oddsmodel.likelihood.kernels import GramKernel
from oddsmodel.passes import Leaf, MemoryPasses, Passes, Work

Index = NDArray[np.int64]


class WithoutRows:
    """The log-likelihood of the rows of a binomial likelihood other than those at some positions (k,).

    Values are those of all rows less those of the few. What decides on rank and separation is not subtracted but
    found anew, in passes in which the few have no trials.
    """

    curvature: Literal["Hessian", "expected"] = "Hessian"
    concave = True

    def __init__(self, likelihood: BinomialLikelihood, positions: Index) -> None:
        self.likelihood, self.positions = likelihood, positions
        self.few = BinomialLikelihood.over(
            MemoryPasses(likelihood.passes.taken(positions.tolist())), likelihood.parameters
        )
        self.passes = CountedRows(likelihood.passes, positions)

    @property
    def parameters(self) -> int:
        return self.likelihood.parameters

    @property
    def rows(self) -> int:
        return self.likelihood.rows

    def evaluate(self, beta: Array, *, member: Index | None = None, information: bool = True) -> Evaluation:
        whole = self.likelihood.evaluate(beta, member=member, information=information)
        few = self.few.evaluate(beta, information=information)
        there = np.isfinite(whole.log_likelihood)
        curvature = None
        if whole.information is not None and few.information is not None:
            curvature = whole.information - few.information
        value = np.full(there.shape, -np.inf)
        value[there] = whole.log_likelihood[there] - few.log_likelihood[there]
        return Evaluation(value, whole.score - few.score, curvature)

    def gram(self) -> Array:
        return np.asarray(sum(self.passes.each(_gram)))

    def transformed(self, basis: Array) -> WithoutRows:
        return WithoutRows(self.likelihood.transformed(basis), self.positions)

    def thinned(self, leaves: int) -> BinomialLikelihood:
        return self.likelihood.thinned(leaves)

    def triangle(self) -> Array:
        triangle = np.zeros((0, self.parameters))
        for part in self.passes.each(triangle_of_rows):
            triangle = np.asarray(np.linalg.qr(np.vstack([triangle, part]), mode="r"))
        return triangle

    def rows_apart(self) -> tuple[Array, Array, Array]:
        X, events, trials = self.likelihood.rows_apart()
        rows = _uncounted({"X": X, "events": events, "trials": trials}, self.positions)
        return X, rows["events"], rows["trials"]

    def extended_score(self, beta: NDArray[np.longdouble]) -> NDArray[np.longdouble]:
        return self.likelihood.extended_score(beta) - self.few.extended_score(beta)


class CountedRows:
    """The rows of a pass, those at some positions (k,) without events and trials, for work that looks at them all."""

    def __init__(self, passes: Passes, positions: Index) -> None:
        self.whole, self.positions = passes, positions
        self.rows = passes.rows

    def each(self, work: Work, state: Any = None) -> Iterator[Any]:
        """One pass: the results of the work for every task, in source order."""
        return self.whole.each(_Without(work, self.positions), state)


@dataclass(frozen=True)
class _Without:
    work: Work
    positions: Index

    def __call__(self, rows: Leaf, first: int, state: Any) -> Any:
        own = self.positions[(self.positions >= first) & (self.positions < first + len(rows["X"]))]
        return self.work(_uncounted(rows, own - first) if own.size else rows, first, state)


def _uncounted(rows: Leaf, places: Index) -> Leaf:
    events, trials = rows["events"].copy(), rows.get("trials")
    trials = np.ones_like(events) if trials is None else trials.copy()
    events[places] = trials[places] = 0.0
    return {**rows, "events": events, "trials": trials}


def _gram(rows: Leaf, first: int, state: None) -> Array:
    return GramKernel().leaf(rows, state)[0]
