"""Likelihoods of data sets that are the same rows counted otherwise, against copies of the rows, and the pass used."""

from __future__ import annotations

import pickle
from collections.abc import Iterator
from typing import Any

import numpy as np
import pytest

from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.likelihood.resampled import ResampledLikelihood
from oddsmodel.passes import MemoryPasses, Work


def data(n: int = 9000, p: int = 4, members: int = 12) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(3)
    X = np.column_stack([np.ones(n), rng.normal(size=(n, p - 1))])
    trials = rng.poisson(1.0, size=(members, n))
    return X, rng.binomial(trials, 0.3), trials, rng.normal(size=(members, p))


@pytest.mark.parametrize("members", [1, 12])
def test_each_member_is_the_binomial_likelihood_of_its_own_counts(members: int) -> None:
    X, events, trials, beta = data(members=members)
    resampled = ResampledLikelihood(MemoryPasses({"X": X}), X.shape[1], events, trials)
    found = resampled.evaluate(beta)
    assert found.information is not None
    for one in range(members):
        # copies: every row written out as often as it counts
        written = np.repeat(np.arange(len(X)), trials[one])
        both = zip(events[one], trials[one] - events[one], strict=True)
        outcome = np.concatenate([np.repeat([1.0, 0.0], pair) for pair in both])
        own = BinomialLikelihood(X[written], outcome).evaluate(beta[one])
        assert own.information is not None
        assert found.log_likelihood[one] == pytest.approx(own.log_likelihood[0], rel=1e-12)
        assert found.score[one] == pytest.approx(own.score[0], rel=1e-9, abs=1e-9)
        assert found.information[one] == pytest.approx(own.information[0], rel=1e-9, abs=1e-9)
        assert resampled.grams()[one] == pytest.approx(X[written].T @ X[written], rel=1e-12)
    assert resampled.linear(beta) == pytest.approx(beta @ X.T, rel=1e-12)


def test_members_are_named_in_any_order_and_more_than_once() -> None:
    X, events, trials, beta = data()
    resampled = ResampledLikelihood(MemoryPasses({"X": X}), X.shape[1], events, trials)
    whole = resampled.evaluate(beta)
    named = resampled.evaluate(beta[[5, 0, 5]], member=np.array([5, 0, 5]), information=False)
    assert named.information is None
    assert named.log_likelihood == pytest.approx(whole.log_likelihood[[5, 0, 5]], rel=1e-12)
    assert named.score == pytest.approx(whole.score[[5, 0, 5]], rel=1e-9)


class Shipped(MemoryPasses):
    """Rows whose work is pickled on the way, as for workers in other processes."""

    def each(self, work: Work, state: Any = None) -> Iterator[Any]:
        there = pickle.loads(pickle.dumps((work, state)))
        return (pickle.loads(pickle.dumps(result)) for result in super().each(*there))


def test_several_tasks_and_rows_on_workers_give_the_same() -> None:
    X, events, trials, beta = data(n=140_000, members=3)
    held = ResampledLikelihood(MemoryPasses({"X": X}), X.shape[1], events, trials)
    shipped = ResampledLikelihood(Shipped({"X": X}), X.shape[1], events, trials)
    one, other = held.evaluate(beta), shipped.evaluate(beta)
    assert np.array_equal(one.score, other.score)
    assert np.array_equal(one.log_likelihood, other.log_likelihood)
    assert one.log_likelihood[1] == pytest.approx(
        BinomialLikelihood(X, events[1], trials=trials[1]).evaluate(beta[1]).log_likelihood[0], rel=1e-12
    )


def test_counts_are_held_in_few_bytes_and_far_off_values_are_minus_infinity() -> None:
    X = np.array([[1.0, 1e200], [1.0, 2e200]])
    resampled = ResampledLikelihood(MemoryPasses({"X": X}), 2, np.array([[1, 0]]), np.array([[1, 300]]))
    assert resampled.trials.dtype == np.uint16
    assert resampled.events.dtype == np.uint8
    found = resampled.evaluate(np.array([[0.0, 1e200]]))
    assert found.log_likelihood.tolist() == [-np.inf]
    assert np.isfinite(found.score).all()
    assert found.information is not None
    assert np.isfinite(found.information).all()


def test_shapes_that_disagree() -> None:
    passes = MemoryPasses({"X": np.ones((3, 1))})
    with pytest.raises(ValueError, match="a row for each member"):
        ResampledLikelihood(passes, 1, np.ones((2, 3), dtype=int), np.ones((2, 4), dtype=int))
    with pytest.raises(ValueError, match="a row for each member"):
        ResampledLikelihood(passes, 1, np.ones((2, 4), dtype=int), np.ones((2, 4), dtype=int))
