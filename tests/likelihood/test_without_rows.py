"""A likelihood without a few rows against that of the other rows alone."""

from __future__ import annotations

import numpy as np
import pytest

from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.likelihood.without_rows import WithoutRows

N = 150_000
OUT = np.array([140_001, 3, 65_536, 70_000])


def both(*, trials: bool) -> tuple[WithoutRows, BinomialLikelihood]:
    rng = np.random.default_rng(6)
    X = np.column_stack([np.ones(N), rng.normal(size=(N, 2)), np.isin(np.arange(N), OUT[:2])])
    number = rng.integers(0, 5, N).astype(float) if trials else np.ones(N)
    events = rng.binomial(number.astype(int), 0.3).astype(float)
    keep = np.ones(N, dtype=bool)
    keep[OUT] = False
    given = {"trials": number} if trials else {}
    rest = {"trials": number[keep]} if trials else {}
    likelihood = BinomialLikelihood(X, events, **given)
    return WithoutRows(likelihood, OUT), BinomialLikelihood(X[keep], events[keep], **rest)


@pytest.mark.parametrize("trials", [False, True])
def test_values_are_those_of_the_other_rows(trials: bool) -> None:
    without, rest = both(trials=trials)
    beta = np.array([[-1.0, 0.3, -0.2, 0.5], [-0.8, 0.1, 0.0, -0.4]])
    one, other = without.evaluate(beta), rest.evaluate(beta)
    assert one.log_likelihood == pytest.approx(other.log_likelihood, rel=1e-12)
    assert one.score == pytest.approx(other.score, abs=1e-8)
    assert one.information == pytest.approx(other.information, abs=1e-8)
    assert without.evaluate(beta, information=False).information is None
    extended = without.extended_score(beta[0].astype(np.longdouble))
    assert np.asarray(extended, float) == pytest.approx(other.score[0], abs=1e-8)


@pytest.mark.parametrize("trials", [False, True])
def test_rank_is_that_of_the_other_rows_exactly(trials: bool) -> None:
    without, rest = both(trials=trials)
    assert without.gram() == pytest.approx(rest.gram(), rel=1e-12)
    # the last column is filled by rows left out alone: no rounding may stay behind
    assert not without.gram()[3].any()
    assert not without.triangle()[:, 3].any()
    X, _, number = rest.rows_apart()
    X, triangle = X[number > 0], without.triangle()
    assert triangle.T @ triangle == pytest.approx(X.T @ X, rel=1e-10)
    assert maximise(without).status == "aliased"
    narrowed = without.transformed(np.eye(4)[:, :3])
    fit, alone = maximise(narrowed), maximise(rest.transformed(np.eye(4)[:, :3]))
    assert fit.status == "converged"
    assert fit.coefficients == pytest.approx(alone.coefficients, abs=1e-10)
    assert fit.log_likelihood == pytest.approx(alone.log_likelihood, rel=1e-12)


def test_rows_left_out_have_no_part_in_separation() -> None:
    X = np.array([[1.0, 0], [1, 0], [1, 1], [1, 1]])
    events = np.array([0.0, 1, 1, 0])
    likelihood = BinomialLikelihood(X, events)
    assert maximise(likelihood).status == "converged"
    assert maximise(WithoutRows(likelihood, np.array([3]))).status == "no finite maximum"
    X_apart, events_apart, trials_apart = WithoutRows(likelihood, np.array([3])).rows_apart()
    assert X_apart is X
    assert events_apart.tolist() == [0, 1, 1, 0]
    assert trials_apart.tolist() == [1, 1, 1, 0]
    assert events.tolist() == [0, 1, 1, 0]
