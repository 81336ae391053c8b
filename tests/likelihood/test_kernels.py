"""Sums over leaves against extended precision and 50-digit arithmetic, whatever the number of vectors."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest

from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.likelihood.kernels import BATCH, GramKernel, ValueKernel
from oddsmodel.passes import LEAF_ROWS


def rows_of(n: int, p: int, *, trials: bool, offset: bool) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(n + p)
    rows = {"X": np.column_stack([np.ones(n), rng.normal(size=(n, p - 2)), rng.random(n) < 0.2])}
    size = rng.integers(0, 9, n) if trials else np.ones(n, dtype=int)
    rows["events"] = rng.binomial(size, 0.4).astype(float)
    if trials:
        rows["trials"] = size.astype(float)
    if offset:
        rows["offset"] = rng.normal(size=n)
    return rows


def in_extended_precision(rows: dict[str, np.ndarray], beta: np.ndarray) -> tuple[float, np.ndarray, np.ndarray]:
    X, y = rows["X"].astype(np.longdouble), rows["events"].astype(np.longdouble)
    n = rows.get("trials", np.ones(len(y))).astype(np.longdouble)
    eta = X @ beta.astype(np.longdouble) + rows.get("offset", np.zeros(len(y)))
    risk = 1 / (1 + np.exp(-eta))
    value = (y * eta - n * np.log1p(np.exp(eta))).sum()
    information = (X * (n * risk * (1 - risk))[:, None]).T @ X
    return float(value), ((y - n * risk) @ X).astype(float), information.astype(float)


@pytest.mark.parametrize("k", [1, 2, 3, 9, 40])
@pytest.mark.parametrize(("trials", "offset"), [(False, False), (True, False), (False, True), (True, True)])
def test_many_vectors_and_few(k: int, trials: bool, offset: bool) -> None:
    rows = rows_of(2 * LEAF_ROWS + 77, 5, trials=trials, offset=offset)
    beta = np.random.default_rng(k).normal(size=(k, 5)) * 0.7
    likelihood = BinomialLikelihood(rows["X"], rows["events"], rows.get("trials"), rows.get("offset"))
    found, plain = likelihood.evaluate(beta), likelihood.evaluate(beta, information=False)
    assert found.information is not None
    assert plain.information is None
    assert np.array_equal(found.log_likelihood, plain.log_likelihood)
    assert np.array_equal(found.score, plain.score)
    for one in range(k):
        value, score, information = in_extended_precision(rows, beta[one])
        scale = np.sqrt(np.diag(information))
        assert found.log_likelihood[one] == pytest.approx(value, rel=1e-14)
        assert found.score[one] / scale == pytest.approx(score / scale, abs=1e-11)
        assert found.information[one] / np.outer(scale, scale) == pytest.approx(
            information / np.outer(scale, scale), abs=1e-13
        )


def test_wide_rows_take_the_other_way_to_the_information() -> None:
    rows = rows_of(700, 40, trials=True, offset=False)
    likelihood = BinomialLikelihood(rows["X"], rows["events"], rows["trials"])
    beta = np.random.default_rng(0).normal(size=(14, 40)) * 0.1
    found = likelihood.evaluate(beta).information
    assert found is not None
    for one in range(14):
        expected = in_extended_precision(rows, beta[one])[2]
        assert np.abs(found[one] - expected).max() < 1e-13 * np.abs(expected).max()


@pytest.mark.parametrize("vectors", [1, 2])
def test_leaves_together_give_the_bits_of_leaves_apart(vectors: int) -> None:
    rows = rows_of(BATCH * LEAF_ROWS, 6, trials=True, offset=True)
    beta = np.random.default_rng(4).normal(size=(vectors, 6))
    beta[0, 0] = 900.0
    apart = [
        {name: array[at : at + LEAF_ROWS] for name, array in rows.items()} for at in range(0, len(rows["X"]), LEAF_ROWS)
    ]
    for kernel, state in ((ValueKernel(True, vectors), beta), (GramKernel(), None)):
        together = kernel.leaves(rows, BATCH, state)
        for one, leaf in enumerate(apart):
            for whole, part in zip(together, kernel.leaf(leaf, state), strict=True):
                assert np.array_equal(whole[one], part)


@pytest.mark.parametrize("eta", [-800.0, -40.0, -1e-9, 0.0, 3.0, 37.0, 720.0])
@pytest.mark.parametrize(
    ("events", "trials"), [(0.0, 1.0), (1.0, 1.0), (0.25, 1.0), (7.0, 7.0), (2.0, 7.0), (5.0, 7.0)]
)
def test_a_row_to_its_last_digits(eta: float, events: float, trials: float) -> None:
    likelihood = BinomialLikelihood(np.ones((1, 1)), [events], None if trials == 1.0 else [trials])
    found = likelihood.evaluate(np.array([[eta]]))
    assert found.information is not None
    with mpmath.workdps(60):
        odds = mpmath.exp(mpmath.mpf(eta))
        value = events * mpmath.mpf(eta) - trials * mpmath.log1p(odds)
        risk = odds / (1 + odds)
        assert found.log_likelihood[0] == pytest.approx(float(value), rel=1e-14)
        assert found.score[0, 0] == pytest.approx(float(events - trials * risk), rel=1e-14, abs=1e-15)
        assert found.information[0, 0, 0] == pytest.approx(float(trials * risk * (1 - risk)), rel=1e-14, abs=1e-290)


def test_no_rows_add_nothing() -> None:
    likelihood = BinomialLikelihood(np.empty((0, 3)), np.empty(0))
    for k in (1, 20):
        found = likelihood.evaluate(np.zeros((k, 3)))
        assert found.information is not None
        assert not found.log_likelihood.any()
        assert not found.score.any()
        assert not found.information.any()
