"""Splines: Harrell's formula, straight tails, continuity, and the same bases by scipy."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest
from scipy.interpolate import BSpline, CubicSpline

from oddsmodel.design.splines import HARRELL_QUANTILES, harrell_knots, restricted_cubic_basis


def test_quantiles_are_symmetric_and_rising() -> None:
    for number, shares in HARRELL_QUANTILES.items():
        assert len(shares) == number
        np.testing.assert_allclose(np.add(shares, shares[::-1]), 1.0, atol=1e-12)
        assert (np.diff(shares) > 0).all()


def test_knots_are_quantiles() -> None:
    """Harrell 2001, table 2.3 (from memory): 5 knots at 0.05, 0.275, 0.5, 0.725 and 0.95."""
    x = np.random.default_rng(1).normal(size=501)
    np.testing.assert_allclose(harrell_knots(x, 5), np.quantile(x, [0.05, 0.275, 0.5, 0.725, 0.95]))
    counts = np.random.default_rng(2).integers(0, 6, 501).astype(float)
    written_out = np.repeat(x, counts.astype(int))
    for number in HARRELL_QUANTILES:
        expected = np.quantile(written_out, HARRELL_QUANTILES[number])
        np.testing.assert_allclose(harrell_knots(x, number, counts), expected, atol=1e-12)


@pytest.mark.parametrize("knots", [[-1.0, 0.3, 2.0], [1.0, 2.0, 4.0, 7.5], [1950.0, 1960.0, 1961.0, 1990.0, 2005.0]])
def test_restricted_cubic_is_the_natural_spline(knots: list[float]) -> None:
    """The columns span with a constant what scipy's natural cubic spline spans, and are straight beyond the knots."""
    t = np.array(knots)
    span = t[-1] - t[0]
    x = np.linspace(t[0], t[-1], 101)
    basis = restricted_cubic_basis(x, t)
    assert basis.shape == (101, len(t) - 1)
    np.testing.assert_array_equal(basis[:, 0], x)
    natural = CubicSpline(t, restricted_cubic_basis(t, t), bc_type="natural")(x)
    np.testing.assert_allclose(basis, natural, atol=1e-10 * span)
    assert np.linalg.matrix_rank(np.column_stack([np.ones(101), (basis - basis.mean(0)) / span])) == len(t)

    below = restricted_cubic_basis(np.linspace(t[0] - 3 * span, t[0], 20), t)
    above = restricted_cubic_basis(np.linspace(t[-1], t[-1] + 3 * span, 20), t)
    np.testing.assert_array_equal(below[:, 1:], 0.0)
    np.testing.assert_allclose(np.diff(above, n=2, axis=0), 0.0, atol=1e-9 * span)


def test_scaling_has_the_unit_of_x() -> None:
    """Harrell 2001, equation 2.25: divided by the squared distance of the outermost knots."""
    x, t = np.linspace(0.0, 12.0, 30), np.array([1.0, 4.0, 6.0, 11.0])
    np.testing.assert_allclose(restricted_cubic_basis(10 * x, 10 * t), 10 * restricted_cubic_basis(x, t), rtol=1e-12)
    by_hand = (5.0 - 1.0) ** 3 / (11.0 - 1.0) ** 2
    np.testing.assert_allclose(restricted_cubic_basis([5.0], t)[0, 1], by_hand)


def test_rcs_in_a_formula(clinic: Any) -> None:
    age = clinic.frame["age"].to_numpy()
    expected = restricted_cubic_basis(age, np.quantile(age, HARRELL_QUANTILES[4]))
    np.testing.assert_array_equal(clinic.matrix("rcs(age, 4)")[:, 1:], expected)
    given = restricted_cubic_basis(age, [30.0, 40.0, 70.0])
    np.testing.assert_array_equal(clinic.matrix("0 + rcs(age, [30, 40, 70])"), given)
    logs = np.log(age)
    expected = restricted_cubic_basis(logs, np.quantile(logs, HARRELL_QUANTILES[3]))
    np.testing.assert_array_equal(clinic.matrix("rcs(log(age), 3)")[:, 1:], expected)


@pytest.mark.parametrize("degree", [0, 1, 2, 3, 4, 5])
def test_b_spline_is_that_of_scipy(clinic: Any, degree: int) -> None:
    bmi = clinic.frame["bmi"].to_numpy()
    ends = [bmi.min(), bmi.max()]
    knots = np.r_[[ends[0]] * (degree + 1), 21.0, 24.0, 28.0, [ends[1]] * (degree + 1)]
    found = clinic.matrix(f"0 + bs(bmi, knots=[21, 24, 28], degree={degree})")
    expected = BSpline.design_matrix(bmi, knots, degree).toarray()[:, 1:]
    np.testing.assert_allclose(found, expected, atol=1e-12)


@pytest.mark.parametrize(
    "formula", ["bs(bmi, df=5)", "bs(bmi, df=3, degree=2)", "bs(bmi, df=2, degree=1)", "cr(bmi, df=4)"]
)
def test_straight_beyond_the_training_values(clinic: Any, formula: str) -> None:
    """Value and slope run on from the outermost knots; nothing fails outside them."""
    design = clinic.design(f"0 + {formula}")
    lower, upper = clinic.frame["bmi"].min(), clinic.frame["bmi"].max()
    step = 1e-5
    for edge, way in ((lower, -1.0), (upper, 1.0)):
        places = edge + way * np.array([0.0, 1.0, 2.0, 3.0, step, -step])
        columns = design.encode(pd.DataFrame({"bmi": places}))
        np.testing.assert_allclose(np.diff(columns[:4], n=2, axis=0), 0.0, atol=1e-9)
        np.testing.assert_allclose(columns[4] - columns[0], columns[0] - columns[5], atol=1e-8)


def test_degree_0_is_constant_beyond(clinic: Any) -> None:
    design = clinic.design("0 + bs(bmi, df=3, degree=0)")
    columns = design.encode(pd.DataFrame({"bmi": [-100.0, 1000.0]}))
    ends = design.encode(pd.DataFrame({"bmi": [clinic.frame["bmi"].min(), clinic.frame["bmi"].max()]}))
    np.testing.assert_array_equal(columns, ends)


def test_cyclic_spline_repeats(study_of: Any) -> None:
    study = study_of(pd.DataFrame({"hour": np.linspace(0.0, 24.0, 49)}))
    design = study.design("0 + cc(hour, df=5)")
    hours = np.linspace(0.5, 23.5, 24)
    within = design.encode(pd.DataFrame({"hour": hours}))
    np.testing.assert_allclose(design.encode(pd.DataFrame({"hour": hours + 24.0})), within, atol=1e-12)
    np.testing.assert_allclose(design.encode(pd.DataFrame({"hour": hours - 48.0})), within, atol=1e-12)
    ends = design.encode(pd.DataFrame({"hour": [0.0, 24.0]}))
    np.testing.assert_allclose(ends[0], ends[1], atol=1e-12)
