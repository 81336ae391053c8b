"""Trends over ordered levels, against fits by statsmodels of the score as a number and of the model without it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm
from scipy.stats import chi2

from oddsmodel.measures.trend import trend_table, trends

LEVELS = ["none", "some", "much", "most"]


def records(seed: int = 5, n: int = 700) -> tuple[pd.DataFrame, Any]:
    rng = np.random.default_rng(seed)
    dose = rng.choice(4, n, p=[0.4, 0.3, 0.2, 0.1])
    age = rng.normal(50, 10, n).round()
    linear = -0.8 + np.array([0.0, 0.2, 0.9, 0.8])[dose] + 0.03 * (age - 50)
    frame = pd.DataFrame({"dose": pd.Categorical(np.array(LEVELS)[dose], LEVELS, ordered=True), "age": age})
    return frame, rng.random(n) < 1 / (1 + np.exp(-linear))


def log_likelihood(X: Any, y: Any) -> tuple[float, Any, Any]:
    fitted = sm.GLM(y.astype(float), X, family=sm.families.Binomial()).fit(tol=1e-13)
    return fitted.llf, fitted.params, fitted.bse


@pytest.mark.parametrize("scores", [[0.0, 1.0, 2.0, 3.0], [0.0, 1.0, 4.0, 10.0]])
def test_step_and_tests_are_those_of_separate_fits(fitting: Callable[..., Any], scores: list[float]) -> None:
    frame, event = records()
    model, found = fitting(frame, event, "dose + age", ["dose"])
    stated = None if scores == [0.0, 1.0, 2.0, 3.0] else {"dose": scores}
    (trend,) = trends(model, ["dose"], stated)
    codes = frame.dose.cat.codes.to_numpy()
    constant, age = np.ones(len(frame)), frame.age.to_numpy()
    full = log_likelihood(np.column_stack([constant, age, *(codes == k for k in (1, 2, 3))]).astype(float), event)
    line = log_likelihood(np.column_stack([constant, age, np.array(scores)[codes]]), event)
    without = log_likelihood(np.column_stack([constant, age]), event)

    assert trend.scores == tuple(zip(LEVELS, scores, strict=True))
    assert trend.step is not None
    assert trend.step.log_odds_ratio == pytest.approx(line[1][2], abs=1e-8)
    assert trend.step.standard_error == pytest.approx(line[2][2], abs=1e-7)
    statistic = 2 * (line[0] - without[0])
    assert trend.trend.likelihood_ratio == pytest.approx(statistic, abs=1e-7)
    assert trend.trend.p == pytest.approx(chi2.sf(statistic, 1), rel=1e-6)
    departure = 2 * (full[0] - line[0])
    assert trend.departure.df == 2
    assert trend.departure.likelihood_ratio == pytest.approx(departure, abs=1e-7)
    assert trend.departure.p == pytest.approx(chi2.sf(departure, 2), rel=1e-6)

    # Profile limits: at each the statsmodels fit with the score's coefficient held there is q/2 lower.
    for limit in (trend.step.profile.lower, trend.step.profile.upper):
        assert limit is not None
        held = sm.GLM(
            event.astype(float),
            np.column_stack([constant, age]),
            family=sm.families.Binomial(),
            offset=np.log(limit) * np.array(scores)[codes],
        ).fit(tol=1e-13)
        assert line[0] - held.llf == pytest.approx(chi2.ppf(0.95, 1) / 2, abs=1e-6)

    table = trend_table(model, trend, found)
    assert [row[0] for row in table.rows] == [
        *(f"dose: {level}" for level in LEVELS), "Per step", "Departure from the trend",
    ]  # fmt: skip
    assert [row[1] for row in table.rows[:4]] == scores
    assert table.rows[0][2] == "1 (reference)"
    assert table.rows[1][2] == found[1].odds_ratio
    assert table.rows[4][4] == trend.trend.p


def test_grouped_records_give_the_same_trend(fitting: Callable[..., Any]) -> None:
    frame, event = records()
    frame["age"] = (frame.age > 50).astype(float)
    together = frame.assign(event=event).groupby(["dose", "age", "event"], observed=True).size().reset_index(name="n")
    one, _ = fitting(frame, event, "dose + age", ["dose"])
    grouped, _ = fitting(together[["dose", "age"]], together.event, "dose + age", ["dose"], counts=together.n)
    (first,), (second,) = trends(one, ["dose"]), trends(grouped, ["dose"])
    assert first.step is not None
    assert second.step is not None
    assert second.step.odds_ratio == pytest.approx(first.step.odds_ratio, rel=1e-9)
    assert second.trend.likelihood_ratio == pytest.approx(first.trend.likelihood_ratio, rel=1e-8)


def test_a_level_without_records_keeps_the_places_of_the_others(fitting: Callable[..., Any]) -> None:
    frame, event = records()
    rows = (frame.dose != "some").to_numpy()
    model, found = fitting(frame[rows].reset_index(drop=True), event[rows], "dose + age", ["dose"])
    (trend,) = trends(model, ["dose"])
    codes = frame.dose.cat.codes.to_numpy()[rows]
    line = log_likelihood(np.column_stack([np.ones(rows.sum()), frame.age[rows], codes]).astype(float), event[rows])
    assert trend.step is not None
    assert trend.step.log_odds_ratio == pytest.approx(line[1][2], abs=1e-8)
    assert trend.departure.df == 1
    assert len(trend_table(model, trend, found).rows) == 5


def test_where_there_is_no_trend_it_is_said(fitting: Callable[..., Any]) -> None:
    frame, event = records()
    model, found = fitting(frame, event, "dose * age", ["dose"])
    (trend,) = trends(model, ["dose"])
    assert trend.step is None
    assert trend.trend.p is None
    assert trend.reason is not None
    assert "another way than by levels" in trend.reason
    assert trend.reason in trend_table(model, trend, found).note

    two = frame.assign(dose=pd.Categorical(np.where(frame.dose == "none", "none", "some"), ["none", "some"]))
    model, _ = fitting(two, event, "dose + age", ["dose"])
    (trend,) = trends(model, ["dose"])
    assert trend.departure.p is None
    assert trend.departure.reason == "With two levels there is nothing left to depart from the trend."
    assert trends(model, []) == ()
