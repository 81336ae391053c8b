"""Wald limits against scipy's normal distribution."""

from __future__ import annotations

import math

import pytest
from scipy.stats import norm

from oddsmodel.measures.wald import normal_quantile, standard_error_from_ratios, wald


@pytest.mark.parametrize("level", [0.5, 0.9, 0.95, 0.999])
@pytest.mark.parametrize(("estimate", "error"), [(0.3, 0.2), (-5.0, 0.7), (0.0, 1.0), (12.0, 0.5)])
def test_against_scipy(estimate: float, error: float, level: float) -> None:
    found = wald(estimate, error, level)
    lower, upper = norm.interval(level, loc=estimate, scale=error)
    assert found.lower == pytest.approx(lower, abs=1e-12)
    assert found.upper == pytest.approx(upper, abs=1e-12)
    assert found.p == pytest.approx(2 * norm.sf(abs(estimate) / error), rel=1e-12)
    assert standard_error_from_ratios(math.exp(lower), math.exp(upper), level) == pytest.approx(error, rel=1e-12)


@pytest.mark.parametrize(("estimate", "error"), [(math.inf, 1.0), (0.0, 0.0), (0.0, math.nan), (1.0, -1.0)])
def test_refuses_what_has_no_interval(estimate: float, error: float) -> None:
    with pytest.raises(ValueError, match="Wald"):
        wald(estimate, error)


def test_refuses_a_level_in_percent() -> None:
    with pytest.raises(ValueError, match="between 0 and 1"):
        normal_quantile(95)
