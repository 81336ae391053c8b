"""The recession cone of many rows: planted separation is found and proved, in memory or not."""

from __future__ import annotations

import sys
import time
from pathlib import Path

import numpy as np
import pytest

from oddsmodel.inference import maximise, separation, separation_of
from oddsmodel.inference.separation import separating_direction
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.passes import Leaf, MemoryPasses
from oddsmodel.passes.local import LocalPasses, MemorySource

sys.path.insert(0, str(Path(__file__).parent))
from enumerated_cone import sides_of

N, P = 200_000, 12


def _rows() -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(11)
    X = np.column_stack(
        [np.ones(N), rng.normal(size=(N, 3)), np.round(rng.normal(50, 15, N)), rng.random((N, P - 5)) < 0.2]
    ).astype(float)
    linear = X @ np.r_[0.0, rng.normal(size=3), 0.02, rng.normal(size=P - 5)]
    linear -= np.median(linear)
    return X, (rng.random(N) < 1 / (1 + np.exp(-linear))).astype(float), linear


def test_overlapping_rows_are_proved_by_a_few_of_them() -> None:
    X, y, _ = _rows()
    verdict = separation(X, y, np.ones(N))
    assert not verdict.separated
    assert verdict.verified
    assert verdict.overlap is not None
    rows, multipliers = list(verdict.overlap.numbers), verdict.overlap.multipliers
    side = sides_of(y, np.ones(N))[rows]
    assert min(multipliers) > 0
    # the weighted sum is zero to the rounding of this float check, and the rows span all columns
    weight = np.array([float(one / max(multipliers)) for one in multipliers]) * side
    assert np.abs(weight @ X[rows]).max() < 1e-9 * np.abs(weight[:, None] * X[rows]).sum(axis=0).max()
    assert np.linalg.matrix_rank(X[rows]) == P


def test_two_rare_levels_among_many_rows() -> None:
    X, y, _ = _rows()
    rng = np.random.default_rng(3)
    X[:, 10:] = 0.0
    falling, rising = rng.choice(N, 40, replace=False), rng.choice(N, 9, replace=False)
    X[falling, 10] = 1.0
    X[rising, 10], X[rising, 11] = 0.0, 1.0
    y[X[:, 10] == 1.0], y[X[:, 11] == 1.0] = 0.0, 1.0
    verdict = separation(X, y, np.ones(N))
    assert verdict.verified
    assert all(verdict.coefficients_verified)
    assert verdict.coefficients == ("finite",) * 10 + ("minus infinity", "plus infinity")
    assert verdict.rows.tolist() == ((X[:, 10] == 1.0) | (X[:, 11] == 1.0)).tolist()
    assert verdict.witness is not None
    assert [np.sign(one) for one in verdict.witness] == [0] * 10 + [-1, 1]


def test_complete_separation_and_two_rows_that_undo_it() -> None:
    X, _, linear = _rows()
    y = (linear > 0).astype(float)
    verdict = separation(X, y, np.ones(N))
    assert verdict.complete
    assert verdict.verified
    margin = np.where(y == 1, 1, -1) * (X @ verdict.direction)
    assert margin.min() > 0
    y[np.argsort(linear)[[N // 4, -N // 4]]] = 1.0, 0.0
    undone = separation(X, y, np.ones(N))
    assert not undone.separated
    assert undone.verified


def test_rows_that_are_not_in_memory() -> None:
    X, y, _ = _rows()
    X[:, 11] = 0.0
    X[np.flatnonzero(y == 0)[::9000], 11] = 1.0
    passes = LocalPasses(MemorySource({"half": X / 2.0, "events": y})).mapped(_doubled)
    away = BinomialLikelihood.over(passes, P)
    verdict, here = separation_of(away), separation(X, y, np.ones(N))
    assert verdict.coefficients == here.coefficients == ("finite",) * 11 + ("minus infinity",)
    assert verdict.rows.tolist() == here.rows.tolist()
    assert verdict.verified
    assert maximise(away).status == "no finite maximum"


def _doubled(rows: Leaf) -> Leaf:
    return {"X": 2.0 * rows["half"], "events": rows["events"]}


def test_a_direction_within_rounding_is_found_without_a_proof() -> None:
    X, y, linear = _rows()
    assert separating_direction(BinomialLikelihood(X, y)) is None
    direction = separating_direction(BinomialLikelihood(X, linear > 0))
    assert direction is not None
    assert (np.where(linear > 0, 1, -1) * (X @ direction) > -1e-6 * np.abs(X @ direction).max()).all()


def test_a_clean_fit_pays_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    X, y, _ = _rows()

    def never(*_: object) -> None:
        raise AssertionError("the program was run on clean rows")

    monkeypatch.setattr("oddsmodel.inference.recession_cone.RecessionCone.__init__", never)
    assert maximise(BinomialLikelihood(X, y)).status == "converged"


def test_the_time_of_a_verdict_is_that_of_some_passes() -> None:
    # in processor time, against bare products of the same rows in the same process
    X, y, _ = _rows()
    X[:, 11] = 0.0
    X[np.flatnonzero(y == 0)[::9000], 11] = 1.0
    passes = MemoryPasses({"X": X, "events": y})
    start = time.process_time()
    for _ in range(10):
        list(passes.each(_products, np.ones(P)))
    one = (time.process_time() - start) / 10
    start = time.process_time()
    assert separation(X, y, np.ones(N)).separated
    assert time.process_time() - start < 300 * one + 1.0


def _products(rows: Leaf, first: int, v: np.ndarray) -> float:
    return float(np.abs(rows["X"] @ v).sum())
