"""A pass gives the same bits whatever does the work, and the right sums."""

from __future__ import annotations

import numpy as np
import pytest

from oddsmodel.likelihood import BinomialLikelihood
from oddsmodel.passes import MemoryPasses, local


class Sum:
    def leaf(self, rows: dict[str, np.ndarray], state: float) -> tuple[np.ndarray, ...]:
        return (rows["x"].sum() * state, np.array(float(len(rows["x"]))))


@pytest.mark.parametrize("n", [1, 4096, 4097, 100_000, 65_536 * 2, 300_001])
def test_every_row_is_counted_once(n: int) -> None:
    passes = MemoryPasses({"x": np.arange(n, dtype=float)})
    (total, rows), (again, _) = passes.reduce([Sum(), Sum()], 2.0)
    assert rows == n
    assert total == again == pytest.approx(n * (n - 1.0))


def test_same_bits_with_and_without_threads(monkeypatch: pytest.MonkeyPatch) -> None:
    rng = np.random.default_rng(4)
    X = rng.normal(size=(150_000, 5))
    likelihood = BinomialLikelihood(X, (rng.random(150_000) < 0.4).astype(float))
    beta = rng.normal(size=(6, 5))
    threaded = likelihood.evaluate(beta)
    monkeypatch.setattr(local, "_workers", lambda: None)
    alone = likelihood.evaluate(beta)
    assert np.array_equal(threaded.log_likelihood, alone.log_likelihood)
    assert np.array_equal(threaded.score, alone.score)
    assert threaded.information is not None
    assert alone.information is not None
    assert np.array_equal(threaded.information, alone.information)
