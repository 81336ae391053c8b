"""Coefficients on the odds-ratio scale, against statsmodels and by design."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
from statsmodels.discrete.discrete_model import Logit

from oddsmodel.inference.profile import ProfileLimits
from oddsmodel.measures.coefficients import coefficients

RECORDS = ["smoke", "race", "age", "lwt"]


def test_against_statsmodels(
    birthwt: pd.DataFrame, fitting: Callable[..., Any], describing: Callable[..., Any]
) -> None:
    columns = describing(birthwt[RECORDS], age={"per": 5.0})
    _, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke + age + race", ["smoke"], columns=columns, level=0.9)
    parts = {
        "Intercept": (np.ones(189), 1.0),
        "smoke": (birthwt["smoke"] == "yes", 1.0),
        "age": (birthwt["age"], 5.0),
        "black": (birthwt["race"] == "black", 1.0),
        "other": (birthwt["race"] == "other", 1.0),
    }
    X = np.column_stack([part for part, _ in parts.values()]).astype(float)
    fit = Logit(birthwt["low"].astype(float), X).fit(disp=0, method="newton", tol=1e-13)
    limits = np.asarray(fit.conf_int(0.1))
    place = {name: position for position, name in enumerate(parts)}
    for one in found:
        name = one.level if one.term == "race" else one.term
        position, per = place[name], parts[name][1]
        assert one.log_odds_ratio == pytest.approx(per * fit.params.iloc[position], rel=1e-8)
        assert one.standard_error == pytest.approx(per * fit.bse.iloc[position], rel=1e-8)
        assert one.odds_ratio == pytest.approx(math.exp(per * fit.params.iloc[position]), rel=1e-8)
        assert np.log([one.wald.lower, one.wald.upper]) == pytest.approx(per * limits[position], rel=1e-7, abs=1e-9)
        assert one.wald.p == pytest.approx(fit.pvalues.iloc[position], rel=1e-7)
        assert one.profile.lower < one.odds_ratio < one.profile.upper
        assert one.role == ("intercept" if name == "Intercept" else "exposure" if name == "smoke" else "adjustment")
    assert [one.crude is not None for one in found] == [one.role == "exposure" for one in found]


def test_intercept_is_not_interpreted_in_a_case_control_study(
    birthwt: pd.DataFrame, fitting: Callable[..., Any]
) -> None:
    for design in ("case-control", "matched case-control"):
        _, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke + age", ["smoke"], design=design)
        intercept = found[0]
        assert intercept.log_odds_ratio is not None
        assert (intercept.odds_ratio, intercept.wald.lower, intercept.profile.upper) == (None, None, None)
        assert "how many controls" in intercept.reasons["odds_ratio"]
        assert found[1].odds_ratio is not None


def test_columns_of_an_interaction_have_no_odds_ratio_of_their_own(
    birthwt: pd.DataFrame, fitting: Callable[..., Any]
) -> None:
    _, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke * lwt + race", ["smoke"])
    for one in found:
        own = one.term in ("Intercept", "race")
        assert (one.odds_ratio is not None) == own
        assert (one.profile.lower is not None) == own
        assert own or "no meaning apart" in one.reasons["wald"]


def test_missing_limits_have_reasons(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    model, _ = fitting(birthwt[RECORDS], birthwt["low"], "smoke", ["smoke"])
    limits = ProfileLimits(
        np.array([-np.inf, np.nan]), np.array([0.0, np.inf]),
        ("no finite limit", "not found"), ("found", "no finite limit"),
    )  # fmt: skip
    intercept, smoke = coefficients(model, limits)
    assert intercept.profile.lower is None
    assert intercept.profile.upper == 1.0
    assert "no finite lower limit" in intercept.reasons["profile.lower"]
    assert (smoke.profile.lower, smoke.profile.upper) == (None, None)
    assert "did not settle" in smoke.reasons["profile.lower"]
    assert "no finite upper limit" in smoke.reasons["profile.upper"]


def test_what_no_number_can_hold(
    birthwt: pd.DataFrame, fitting: Callable[..., Any], describing: Callable[..., Any]
) -> None:
    columns = describing(birthwt[RECORDS], lwt={"per": 1e6})
    _, found = fitting(birthwt[RECORDS], birthwt["low"], "lwt", ["lwt"], columns=columns)
    assert found[1].odds_ratio is None
    assert "too near 0, or too large" in found[1].reasons["odds_ratio"]
    assert found[1].crude.odds_ratio is None
