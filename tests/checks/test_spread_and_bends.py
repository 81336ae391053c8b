"""Spreads of columns against numpy, and the bends of lines against the restricted cubic spline of the design floor."""

from __future__ import annotations

import pickle

import numpy as np
import pytest

from oddsmodel.checks.bends import Bends
from oddsmodel.checks.spread import Among, Spread, spreads
from oddsmodel.design.splines import harrell_knots, restricted_cubic_basis
from oddsmodel.passes import MemoryPasses

SHARES = [0.0, 0.025, 0.1, 0.35, 0.5, 0.9, 1.0]


@pytest.mark.parametrize("n", [1, 7, 500, 140_000])
def test_quantiles_and_bins_are_those_of_numpy(n: int) -> None:
    rng = np.random.default_rng(n)
    X = np.column_stack([rng.normal(size=n), np.round(rng.normal(50, 9, n)), np.zeros(n)])
    own = rng.gamma(2.0, size=n)
    passes = MemoryPasses({"X": X, "column:own": own})
    found = spreads(passes, [Among("X", 0), Among("X", 1), Among("X", 2), Among("column:own")])
    for spread, x in zip(found, (*X.T, own), strict=True):
        assert np.array_equal(spread.values, np.unique(x))
        assert spread.counts.sum() == n
        assert spread.quantiles(SHARES) == pytest.approx(np.quantile(x, SHARES), rel=1e-14)
        edges = np.linspace(*np.quantile(x, [0.1, 0.9]), 9)
        if edges[0] < edges[-1]:
            assert np.array_equal(spread.in_bins(edges), np.histogram(x, edges)[0])


def test_trials_count_and_rows_without_any_do_not() -> None:
    rng = np.random.default_rng(3)
    x, trials = np.round(rng.normal(size=900), 1), rng.integers(0, 4, 900)
    (spread,) = spreads(MemoryPasses({"x": x, "trials": trials.astype(float)}), [Among("x")])
    written_out = np.repeat(x, trials)
    assert np.array_equal(spread.values, np.unique(written_out))
    assert spread.quantiles(SHARES) == pytest.approx(np.quantile(written_out, SHARES), rel=1e-14)
    end = spread.values[0]
    rest = written_out[written_out != end]
    assert spread.without(end).quantiles(SHARES) == pytest.approx(np.quantile(rest, SHARES), rel=1e-14)
    again = Spread.of(x, trials)
    assert np.array_equal(again.counts, spread.counts)


def test_bends_are_the_columns_of_the_spline() -> None:
    rng = np.random.default_rng(4)
    X = np.column_stack([np.ones(20_000), rng.normal(60, 12, 20_000), rng.gamma(2.0, size=20_000)])
    knots = (harrell_knots(X[:, 1], 4), harrell_knots(X[:, 2], 3))
    bends = pickle.loads(pickle.dumps(Bends((1, 2), knots)))
    assert bends.places(3) == [(3, 4), (5,)]
    made = bends({"X": X, "events": X[:, 0]})
    assert np.array_equal(made["X"][:, :3], X)
    for position, place, own in zip((1, 2), bends.places(3), knots, strict=True):
        expected = restricted_cubic_basis(X[:, position], own)[:, 1:]
        assert made["X"][:, list(place)] == pytest.approx(expected, rel=1e-12, abs=1e-12)
