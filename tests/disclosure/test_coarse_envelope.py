"""Envelopes after coarsening: no point stands for few patterns or records, and none shows a single residual."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.disclosure.envelope import coarsen_envelope
from oddsmodel.results.figures import EnvelopeFigure


def envelope(values: list[int], records: list[int]) -> EnvelopeFigure:
    x = np.linspace(0.01, 3.0, len(values))
    lines = (tuple((x * factor).tolist()) for factor in (1.0, 1.1, 1.0, 0.8, 1.3))
    x_line, observed, middle, lower, upper = lines
    return EnvelopeFigure("h", "", "", "", "", x_line, observed, middle, lower, upper, tuple(values), tuple(records))


@settings(deadline=None, derandomize=True, max_examples=200)
@given(st.lists(st.tuples(st.integers(1, 9), st.integers(0, 30)), min_size=1, max_size=60), st.integers(2, 10))
def test_no_point_stands_for_few(points: list[tuple[int, int]], threshold: int) -> None:
    figure = envelope([values for values, _ in points], [values + more for values, more in points])
    coarse = coarsen_envelope(figure, threshold)
    if coarse is None:
        return
    assert len(coarse.x) >= 5
    assert min(coarse.values) >= threshold
    assert min(coarse.records) >= threshold
    assert sum(coarse.values) == sum(figure.values)
    assert sum(coarse.records) == sum(figure.records)
    assert list(coarse.observed) == sorted(coarse.observed)
    assert all(value == round(value, 2) for value in (*coarse.x, *coarse.observed, *coarse.upper))


def test_points_are_means_of_their_values() -> None:
    coarse = coarsen_envelope(envelope([1, 3, 2, 2, 5, 4, 4, 1, 9, 9], [9] * 10), 4)
    assert coarse is not None
    x = np.linspace(0.01, 3.0, 10)
    assert coarse.values == (4, 4, 5, 4, 4, 10, 9)
    assert coarse.x[0] == pytest.approx((x[0] + 3 * x[1]) / 4, abs=0.005)
    assert coarse.x[5] == pytest.approx((x[7] + 9 * x[8]) / 10, abs=0.005)


def test_too_few_patterns_show_no_envelope() -> None:
    assert coarsen_envelope(envelope([1] * 20, [50] * 20), 5) is None
    assert coarsen_envelope(envelope([1] * 25, [50] * 25), 5) is not None
