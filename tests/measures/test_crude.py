"""Crude estimates against statsmodels and a profile likelihood worked out by itself."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest
from scipy.optimize import brentq, minimize_scalar
from statsmodels.discrete.discrete_model import Logit

from oddsmodel.model.kept import KeptRecords

RECORDS = ["smoke", "race", "age", "lwt"]


def of(found: Any, level: str | None, term: str) -> Any:
    return next(one for one in found if one.term == term and one.level == level)


def reference(event: Any, *columns: Any) -> Any:
    X = np.column_stack([np.ones(len(event)), *columns]).astype(float)
    return Logit(np.asarray(event, dtype=float), X).fit(disp=0, method="newton", tol=1e-13)


def profiled(event: Any, x: Any) -> tuple[float, float]:
    """Profile limits of the slope by maximising over the intercept at each slope (scipy), 95%."""
    y, x = np.asarray(event, dtype=float), np.asarray(x, dtype=float)

    def value(slope: float) -> float:
        def minus(intercept: float) -> float:
            linear = intercept + slope * (x - x.mean())
            return float(np.logaddexp(0, linear).sum() - y @ linear)

        return -float(minimize_scalar(minus, bracket=(-2, 2), tol=1e-12).fun)

    fit = reference(y, x)
    slope, error = float(fit.params[1]), float(fit.bse[1])
    height = fit.llf - 3.841458820694124 / 2
    lower = brentq(lambda s: value(s) - height, slope - 6 * error, slope, xtol=1e-10)
    upper = brentq(lambda s: value(s) - height, slope, slope + 6 * error, xtol=1e-10)
    return lower, upper


def test_two_levels(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    _, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke + age + race", ["smoke"])
    crude = of(found, "yes", "smoke").crude
    x = birthwt["smoke"] == "yes"
    fit = reference(birthwt["low"], x)
    lower, upper = np.exp(fit.conf_int()[1])
    assert crude.records == 189
    # 30 of 74 against 29 of 115: by hand from the printed counts of Hosmer & Lemeshow 1989.
    assert crude.odds_ratio == pytest.approx(30 * 86 / (44 * 29), rel=1e-9)
    assert crude.wald.lower == pytest.approx(lower, rel=1e-9)
    assert crude.wald.upper == pytest.approx(upper, rel=1e-9)
    assert crude.wald.p == pytest.approx(fit.pvalues[1], rel=1e-8)
    assert np.log([crude.profile.lower, crude.profile.upper]) == pytest.approx(profiled(birthwt["low"], x), abs=1e-7)


def test_three_levels(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    _, found = fitting(birthwt[RECORDS], birthwt["low"], "race + age", ["race"])
    black, other = birthwt["race"] == "black", birthwt["race"] == "other"
    fit = reference(birthwt["low"], black, other)
    for position, level in ((1, "black"), (2, "other")):
        crude = of(found, level, "race").crude
        assert crude.odds_ratio == pytest.approx(np.exp(fit.params[position]), rel=1e-9)
        assert crude.wald.upper == pytest.approx(np.exp(fit.conf_int()[position, 1]), rel=1e-9)
        assert crude.records == 189


def test_number_per_ten(birthwt: pd.DataFrame, fitting: Callable[..., Any], describing: Callable[..., Any]) -> None:
    columns = describing(birthwt[RECORDS], lwt={"per": 10.0, "units": "pounds"})
    _, found = fitting(birthwt[RECORDS], birthwt["low"], "lwt + smoke", ["lwt"], columns=columns)
    crude = of(found, None, "lwt").crude
    fit = reference(birthwt["low"], birthwt["lwt"])
    assert crude.odds_ratio == pytest.approx(np.exp(10 * fit.params[1]), rel=1e-8)
    assert crude.wald.lower == pytest.approx(np.exp(10 * fit.conf_int()[1, 0]), rel=1e-8)
    lower, upper = profiled(birthwt["low"], birthwt["lwt"])
    assert np.log([crude.profile.lower, crude.profile.upper]) == pytest.approx([10 * lower, 10 * upper], abs=1e-6)


def test_on_all_records(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    frame = birthwt[RECORDS].copy()
    frame.loc[frame.index[:40], "age"] = np.nan
    frame.loc[frame.index[30:36], "smoke"] = np.nan
    complete = frame.notna().all(axis=1)
    kept = KeptRecords(frame, birthwt["low"].to_numpy())
    used = frame[complete].reset_index(drop=True)
    _, found = fitting(used, birthwt["low"][complete], "smoke + age", ["smoke"], kept=kept)
    one = of(found, "yes", "smoke")
    recorded = frame["smoke"].notna()
    fit = reference(birthwt["low"][recorded], frame["smoke"][recorded] == "yes")
    assert one.crude.records == int(complete.sum())
    assert one.crude_all_records.records == 183
    assert one.crude_all_records.odds_ratio == pytest.approx(np.exp(fit.params[1]), rel=1e-9)


def test_all_records_are_not_repeated(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    kept = KeptRecords(birthwt[RECORDS], birthwt["low"].to_numpy())
    _, found = fitting(birthwt[RECORDS], birthwt["low"], "smoke + age", ["smoke"], kept=kept)
    one = of(found, "yes", "smoke")
    assert one.crude_all_records is None
    assert "the ones analysed" in one.reasons["crude_all_records"]


@pytest.mark.parametrize(("formula", "exposure"), [("smoke + age + race", "smoke"), ("lwt + race", "lwt")])
def test_counts_are_true_frequencies(
    birthwt: pd.DataFrame, fitting: Callable[..., Any], formula: str, exposure: str
) -> None:
    counts = np.random.default_rng(5).integers(1, 4, size=len(birthwt))
    _, grouped = fitting(birthwt[RECORDS], birthwt["low"], formula, [exposure], counts=counts)
    longer = birthwt.loc[birthwt.index.repeat(counts)].reset_index(drop=True)
    _, single = fitting(longer[RECORDS], longer["low"], formula, [exposure])
    for one, other in zip(grouped, single, strict=True):
        if one.role == "exposure":
            assert one.crude.records == other.crude.records == counts.sum()
            assert one.crude.odds_ratio == pytest.approx(other.crude.odds_ratio, rel=1e-10)
            assert one.crude.profile.upper == pytest.approx(other.crude.profile.upper, rel=1e-9)


def test_a_level_without_events_spoils_no_other(fitting: Callable[..., Any]) -> None:
    # Among all records level c has no event; among those analysed it has one. By hand from the counts.
    level = pd.Categorical(["a"] * 40 + ["b"] * 40 + ["c"] * 10, categories=["a", "b", "c"])
    event = np.array([True] * 10 + [False] * 30 + [True] * 20 + [False] * 20 + [True] + [False] * 9)
    frame = pd.DataFrame({"dose": level})
    kept_event = event.copy()
    kept_event[80] = False
    kept = KeptRecords(pd.concat([frame, frame.iloc[:5]], ignore_index=True), np.append(kept_event, event[:5]))
    _, found = fitting(frame, event, "dose", ["dose"], kept=kept)
    spoilt = of(found, "c", "dose")
    assert spoilt.crude.odds_ratio == pytest.approx((1 / 9) / (10 / 30), rel=1e-9)
    assert spoilt.crude_all_records.odds_ratio is None
    assert "not finite" in spoilt.reasons["crude_all_records"]
    assert of(found, "b", "dose").crude_all_records.odds_ratio == pytest.approx(1 / (15 / 30), rel=1e-9)


@pytest.mark.parametrize(
    ("formula", "exposures", "words"),
    [
        ("rcs(lwt, 3) + age", ["lwt"], "several columns"),
        ("smoke * age", ["smoke"], "several columns"),
        ("0 + lwt + age", ["lwt"], "no intercept"),
    ],
)
def test_no_crude_estimate_where_none_stands_alone(
    birthwt: pd.DataFrame, fitting: Callable[..., Any], formula: str, exposures: list[str], words: str
) -> None:
    _, found = fitting(birthwt[RECORDS], birthwt["low"], formula, exposures)
    for one in found:
        if one.role == "exposure":
            assert one.crude is None
            assert words in one.reasons["crude"]


def test_functions_bands_and_numbers_as_levels(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    # statsmodels on columns made by numpy and pandas.
    low, lwt = birthwt["low"], birthwt["lwt"]
    (logged,) = [one for one in fitting(birthwt[RECORDS], low, "log(lwt) + age", ["lwt"])[1] if one.role == "exposure"]
    assert logged.crude.odds_ratio == pytest.approx(np.exp(reference(low, np.log(lwt)).params[1]), rel=1e-8)

    bands = [one for one in fitting(birthwt[RECORDS], low, "cut(lwt, [110, 140]) + age", ["lwt"])[1] if one.level]
    middle, high = (lwt >= 110) & (lwt < 140), lwt >= 140
    wanted = np.exp(reference(low, middle, high).params[1:])
    assert [one.crude.odds_ratio for one in bands] == pytest.approx(wanted, rel=1e-8)

    frame = birthwt[["lwt"]].assign(code=(birthwt["race"].cat.codes * 0.5).astype(float))
    levels = [one for one in fitting(frame, low, "C(code) + lwt", ["code"])[1] if one.role == "exposure"]
    wanted = np.exp(reference(low, frame["code"] == 0.5, frame["code"] == 1.0).params[1:])
    assert [one.crude.odds_ratio for one in levels] == pytest.approx(wanted, rel=1e-8)


def test_a_function_without_a_value_on_all_records(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    everyone = pd.concat([birthwt, birthwt.head(2).assign(lwt=[0.0, -1.0])], ignore_index=True)
    kept = KeptRecords(everyone[RECORDS], everyone["low"].to_numpy(dtype=bool))
    _, found = fitting(birthwt[RECORDS], birthwt["low"], "log(lwt) + age", ["lwt"], kept=kept)
    one = next(one for one in found if one.role == "exposure")
    assert (one.crude_all_records.records, one.crude_all_records.odds_ratio) == (191, None)
    assert "log(lwt) is not defined" in one.reasons["crude_all_records"]


def test_levels_that_no_analysed_record_has_are_left_out(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    everyone = pd.concat([birthwt, birthwt.head(5)], ignore_index=True)
    kept = KeptRecords(everyone[RECORDS], everyone["low"].to_numpy(dtype=bool))
    used = birthwt[birthwt["race"] != "other"].reset_index(drop=True)
    _, found = fitting(used[RECORDS], used["low"], "race + age", ["race"], kept=kept)
    one = next(one for one in found if one.level == "black")
    pair = everyone[everyone["race"] != "other"]
    assert (one.crude.records, one.crude_all_records.records) == (len(used), len(pair))
    fit = reference(pair["low"], pair["race"] == "black")
    assert one.crude_all_records.odds_ratio == pytest.approx(np.exp(fit.params[1]), rel=1e-9)
