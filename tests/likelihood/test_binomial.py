"""Values, scores and information of the binomial likelihood against scipy and finite differences."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import approx_fprime
from scipy.stats import binom

from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood


def example(k: int) -> tuple[BinomialLikelihood, np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    rng = np.random.default_rng(k)
    X = np.column_stack([np.ones(40), rng.normal(size=(40, 2))])
    trials = rng.integers(1, 9, 40).astype(float)
    events = rng.binomial(trials.astype(int), 0.3).astype(float)
    return BinomialLikelihood(X, events, trials=trials), X, events, trials, rng.normal(size=(k, 3))


@pytest.mark.parametrize("k", [1, 3, 7])
def test_values_and_derivatives(k: int) -> None:
    likelihood, X, events, trials, beta = example(k)
    evaluation = likelihood.evaluate(beta)
    assert evaluation.information is not None
    for one in range(k):
        risk = 1 / (1 + np.exp(-X @ beta[one]))
        constant = binom.logpmf(events, trials, 0.5).sum() - trials.sum() * np.log(0.5)
        assert evaluation.log_likelihood[one] + constant == pytest.approx(binom.logpmf(events, trials, risk).sum())
        numeric = approx_fprime(beta[one], lambda b: likelihood.evaluate(b).log_likelihood[0], 1e-6)
        assert evaluation.score[one] == pytest.approx(numeric, abs=1e-3)
        assert evaluation.information[one] == pytest.approx(X.T @ np.diag(trials * risk * (1 - risk)) @ X)
        assert likelihood.extended_score(beta[one].astype(np.longdouble)).astype(float) == pytest.approx(
            evaluation.score[one], abs=1e-12
        )


def test_extreme_coefficients_give_no_nan() -> None:
    likelihood, *_ = example(1)
    evaluation = likelihood.evaluate(np.array([[1e308, -1e308, 1e308], [800.0, 0.0, 0.0], [-800.0, 0.0, 0.0]]))
    assert not np.isnan(evaluation.log_likelihood).any()
    assert not np.isnan(evaluation.score).any()


def test_odds_of_even_risk_are_one() -> None:
    # p = 1/2: odds 1, log odds 0; risk = odds / (1 + odds) (published checks, row 15)
    likelihood = BinomialLikelihood(np.ones((1, 1)), [5.0], trials=[10.0])
    assert likelihood.evaluate(np.zeros(1)).score[0, 0] == 0.0
    even = maximise(likelihood)
    assert even.coefficients[0] == 0.0
    odds = np.exp(maximise(BinomialLikelihood(np.ones((1, 1)), [3.0], trials=[12.0])).coefficients[0])
    assert odds == pytest.approx(3 / 9, rel=1e-12)
    assert odds / (1 + odds) == pytest.approx(3 / 12, rel=1e-12)


def test_exposure_for_outcome_is_outcome_for_exposure() -> None:
    # the odds ratio is the same whichever of the two is modelled (published checks, row 15; Cornfield 1951)
    X = np.array([[1.0, 0], [1, 1]])
    outcome = maximise(BinomialLikelihood(X, [104.0, 96], trials=[770.0, 205]))
    exposure = maximise(BinomialLikelihood(X, [109.0, 96], trials=[775.0, 200]))
    assert outcome.coefficients[1] == pytest.approx(exposure.coefficients[1], rel=1e-12)
    assert np.exp(outcome.coefficients[1]) == pytest.approx(96 * 666 / (109 * 104), rel=1e-12)


@pytest.mark.parametrize(
    ("X", "events", "trials"),
    [([1.0], [1.0], None), ([[1.0]], [2.0], None), ([[1.0]], [1.0, 0.0], None), ([[np.nan]], [1.0], None),
     ([[1.0]], [np.nan], None), ([[1.0]], [3.0], [2.0]), ([[np.inf], [-np.inf]], [1.0, 0.0], None)],
)  # fmt: skip
def test_refuses_what_is_not_a_likelihood(X: list, events: list, trials: list | None) -> None:
    with pytest.raises(ValueError, match=r"must"):
        BinomialLikelihood(X, events, trials=trials)


def test_other_members_are_refused() -> None:
    likelihood, *_ = example(1)
    with pytest.raises(ValueError, match="member"):
        likelihood.evaluate(np.zeros((1, 3)), member=np.array([1]))
