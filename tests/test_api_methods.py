"""Methods beside maximum likelihood by way of the Python front."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from scipy.stats.contingency import odds_ratio

import oddsmodel

CELLS = (2, 9, 8, 11)


def frame(a: int, b: int, c: int, d: int) -> pd.DataFrame:
    """Exposed with and without the event, unexposed with and without it."""
    return pd.DataFrame(
        {
            "died": np.repeat(["yes", "no", "yes", "no"], [a, b, c, d]),
            "drug": np.repeat(["yes", "yes", "no", "no"], [a, b, c, d]),
            "ward": np.resize(["A", "B", "A"], a + b + c + d),
        }
    )


def test_exact_limits_stand_in_the_table() -> None:
    a, b, c, d = CELLS
    model = oddsmodel.fit("died ~ drug", frame(*CELLS), event="yes", exposures=["drug"], method="exact")
    row = model.odds_ratios().loc["drug: yes against no"]
    reference = odds_ratio([[a, b], [c, d]], kind="conditional")
    low, high = reference.confidence_interval(0.95)
    assert row["odds_ratio"] == pytest.approx(reference.statistic, rel=1e-7)
    assert [row["exact_lower"], row["exact_upper"]] == pytest.approx([low, high], rel=1e-7)
    assert row["exact_lower"] < row["mid_p_lower"] < row["median_unbiased"] < row["mid_p_upper"] < row["exact_upper"]
    assert "wald_lower" not in model.odds_ratios().columns
    compared = model.compare().loc["drug: yes against no"]
    assert compared["adjusted_upper"] == row["exact_upper"]


def test_penalised_likelihood_and_a_prior() -> None:
    a, b, c, d = CELLS
    settings = {"event": "yes", "exposures": ["drug"]}
    plain = oddsmodel.fit("died ~ drug", frame(*CELLS), **settings)
    half = oddsmodel.fit("died ~ drug", frame(*CELLS), method="penalised", **settings)
    held = oddsmodel.fit("died ~ drug", frame(*CELLS), method="log-F", prior={"m": 2, "columns": ["drug"]}, **settings)
    ratios = [one.odds_ratios()["odds_ratio"].iloc[1] for one in (plain, half, held)]
    assert ratios[0] == pytest.approx(a * d / (b * c))
    assert ratios[1] == pytest.approx((a + 0.5) * (d + 0.5) / ((b + 0.5) * (c + 0.5)))
    assert ratios[0] < ratios[2] < 1
    assert [one.result.method for one in (plain, half, held)] == ["maximum likelihood", "penalised", "log-F"]
    assert half.beside is None


def test_a_separated_model_has_one_limit_and_a_model_beside() -> None:
    model = oddsmodel.fit("died ~ drug + ward", frame(0, 12, 9, 10), event="yes", exposures=["drug"])
    assert model.result.status == "no finite maximum"
    row = model.odds_ratios().loc["drug: yes against no"]
    assert np.isnan(row["odds_ratio"])
    assert np.isnan(row["profile_lower"])
    assert 0 < row["profile_upper"] < 1
    assert model.beside is not None
    assert model.beside.method == "penalised"
    assert "at most" in model._repr_html_()
    assert "By penalised likelihood" in model.report()


@pytest.mark.parametrize(
    ("settings", "told"),
    [
        ({"method": "firth"}, "“firth” is not one of"),
        ({"method": 3}, "is not one of"),
        ({"method": "log-F"}, "needs a prior"),
        ({"prior": {"m": 2, "columns": ["drug"]}}, "used by the method log-F alone"),
        ({"method": "log-F", "prior": {"m": 2, "columns": ["dose"]}}, "not in the formula"),
        ({"method": "log-F", "prior": "strong"}, "m and columns"),
        ({"method": "log-F", "prior": {"m": -1, "columns": ["drug"]}}, "outside the range"),
        ({"method": "exact", "grouped_by": "ward"}, "Records that belong to groups have no likelihood"),
    ],
)
def test_faults(settings: dict[str, object], told: str) -> None:
    with pytest.raises(oddsmodel.InputFault) as caught:
        oddsmodel.fit("died ~ drug", frame(*CELLS), event="yes", exposures=["drug"], **settings)  # type: ignore[arg-type]
    assert told in str(caught.value)
