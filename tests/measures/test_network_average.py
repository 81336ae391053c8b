"""Levels against their average, against sum-coded fits by statsmodels and profile limits searched for directly."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy.optimize import brentq
from scipy.stats import chi2

from oddsmodel.measures.levels import levels
from oddsmodel.measures.network_average import network_average

SITES = ["North", "East", "South", "West"]


def records(seed: int = 8, n: int = 900) -> tuple[pd.DataFrame, Any]:
    rng = np.random.default_rng(seed)
    site = rng.choice(4, n, p=[0.5, 0.25, 0.15, 0.1])
    age = rng.normal(0, 1, n).round(1)
    linear = -1 + np.array([0.0, 0.5, -0.6, 0.3])[site] + 0.5 * age
    frame = pd.DataFrame({"site": pd.Categorical(np.array(SITES)[site], SITES), "age": age})
    return frame, rng.random(n) < 1 / (1 + np.exp(-linear))


def sum_coded(frame: pd.DataFrame, last: int) -> Any:
    """Sum coding with level `last` as the one that is minus the others."""
    codes = frame.site.cat.codes.to_numpy()
    others = [k for k in range(4) if k != last]
    return np.column_stack([(codes == k).astype(float) - (codes == last) for k in others])


def fit(X: Any, y: Any, offset: Any | None = None) -> Any:
    return sm.GLM(y.astype(float), X, family=sm.families.Binomial(), offset=offset).fit(tol=1e-13)


@pytest.mark.parametrize("reference", ["North", "West"])
def test_each_level_is_a_sum_contrast_whatever_the_reference(
    fitting: Callable[..., Any], describing: Callable[..., Any], reference: str
) -> None:
    frame, event = records()
    columns = describing(
        frame, site={"kind": "category", "label": "Site", "levels": tuple(SITES), "reference": reference}
    )
    model, found = fitting(frame, event, "site + age", ["site"], columns=columns)
    against = network_average(model, "site")
    assert [one.level for one in against] == SITES
    assert against[0].label == "Site: North against the network average"
    ones = np.ones((len(frame), 1))
    for place, one in enumerate(against):
        last = (place + 1) % 4
        own = [k for k in range(4) if k != last].index(place) + 1
        X = np.hstack([ones, sum_coded(frame, last), frame[["age"]].to_numpy()])
        fitted = fit(X, event)
        assert one.log_odds_ratio == pytest.approx(fitted.params[own], abs=1e-8)
        assert one.standard_error == pytest.approx(fitted.bse[own], abs=1e-7)
        crude = fit(X[:, :-1], event)
        assert one.crude is not None
        assert np.log(one.crude.odds_ratio) == pytest.approx(crude.params[own], abs=1e-8)
        for matrix, best, limits in ((X, fitted, one.profile), (X[:, :-1], crude, one.crude.profile)):
            rest = np.delete(matrix, own, axis=1)

            def fall(theta: float) -> float:
                held = fit(rest, event, theta * matrix[:, own])  # noqa: B023
                return best.llf - held.llf - chi2.ppf(0.95, 1) / 2  # noqa: B023

            centre, reach = best.params[own], 4 * best.bse[own]
            assert np.log(limits.lower) == pytest.approx(brentq(fall, centre - reach, centre, xtol=1e-10), abs=1e-7)
            assert np.log(limits.upper) == pytest.approx(brentq(fall, centre, centre + reach, xtol=1e-10), abs=1e-7)
    total = sum(one.log_odds_ratio for one in against)
    assert total == pytest.approx(0.0, abs=1e-10)

    table = levels(model, found, against)
    keys = [column.key for column in table.columns]
    assert [row[0] for row in table.rows] == [f"Site: {site}" for site in SITES]
    assert [row[keys.index("adjusted")] for row in table.rows] == [one.odds_ratio for one in against]
    assert [row[keys.index("crude")] for row in table.rows] == [one.crude.odds_ratio for one in against]
    assert "not ranked" in table.note


def test_a_column_in_an_interaction_has_no_average(fitting: Callable[..., Any]) -> None:
    frame, event = records()
    model, _ = fitting(frame, event, "site * age", ["site"])
    assert network_average(model, "site") == ()
