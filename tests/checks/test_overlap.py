"""Overlap of the exposure's groups against statsmodels fits of the exposure."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from oddsmodel.checks import overlap

sys.path.insert(0, str(Path(__file__).parent))
from form_models import birth_weights, fitted


def yes_no(values: np.ndarray) -> pd.Categorical:
    return pd.Categorical(np.where(values, "yes", "no"), ["no", "yes"])


def confounded(n: int = 1500, pull: float = 1.3, seed: int = 4) -> pd.DataFrame:
    rng = np.random.default_rng(seed)
    age, score = rng.normal(60, 10, n), rng.poisson(2, n).astype(float)
    exposed = rng.random(n) < 1 / (1 + np.exp(-(-2.5 + pull * (age - 60) / 10 + 0.3 * score)))
    log_odds = -1.5 + 0.4 * exposed + 0.5 * (age - 60) / 10 + 0.2 * score
    frame = pd.DataFrame({"exposed": yes_no(exposed), "age": age, "score": score})
    frame["y"] = rng.random(n) < 1 / (1 + np.exp(-log_odds))
    return frame


def test_two_groups_agree_with_statsmodels() -> None:
    frame = confounded()
    model = fitted("exposed + age + score", frame[["exposed", "age", "score"]], frame["y"], ["exposed"])
    result = overlap.check(model)

    exposed = (frame["exposed"] == "yes").to_numpy(float)
    others = sm.add_constant(frame[["age", "score"]].to_numpy())
    probability = sm.Logit(exposed, others).fit(disp=0).predict()
    # Walker et al. 2013: logit F = logit S - logit P
    odds = probability / (1 - probability) / (exposed.mean() / (1 - exposed.mean()))
    preference = odds / (1 + odds)
    outside = (preference < 0.05) | (preference > 0.95)
    assert 0 < outside.sum() == result.statistics["outside_records"]

    X = np.column_stack([others, exposed])[~outside]
    inside = sm.Logit(frame["y"].to_numpy(float)[~outside], X).fit(disp=0)
    assert result.statistics["exposure_odds_ratio_within_overlap"] == pytest.approx(np.exp(inside.params[-1]), rel=1e-6)

    (figure,) = result.figures
    assert [name for name, _ in figure.series] == ["yes", "no"]
    expected = np.histogram(preference[exposed == 1], np.linspace(0, 1, 21))[0]
    assert list(figure.series[0][1]) == expected.tolist()
    assert sum(figure.series[1][1]) == int((exposed == 0).sum())
    assert result.tables[0].rows[0][:4] == ("Exposed", "yes", "no", 1500)


def test_groups_that_hardly_meet_are_a_caution() -> None:
    frame = confounded(pull=5.0)
    result = overlap.check(fitted("exposed + age + score", frame[["exposed", "age", "score"]], frame["y"], ["exposed"]))
    assert result.verdict == "caution"
    (finding,) = result.findings
    assert finding.code == "little-overlap"
    assert "without such records, the odds ratio of" in finding.message


def test_an_unrelated_rare_exposure_overlaps() -> None:
    rng = np.random.default_rng(6)
    n = 20_000
    frame = pd.DataFrame({"exposed": yes_no(rng.random(n) < 0.02), "age": rng.normal(size=n)})
    result = overlap.check(fitted("exposed + age", frame, rng.random(n) < 0.3, ["exposed"]))
    assert result.verdict == "fine"
    assert result.statistics["outside_records"] == 0
    assert result.line.startswith("The groups overlap")
    assert result.reasons["exposure_odds_ratio_within_overlap"]


def test_records_with_one_group_only_are_told() -> None:
    rng = np.random.default_rng(9)
    n = 600
    ward = rng.choice(["a", "b", "c"], n, p=[0.5, 0.4, 0.1])
    exposed = (rng.random(n) < 0.5) & (ward != "c")
    frame = pd.DataFrame({"exposed": yes_no(exposed), "ward": pd.Categorical(ward, ["a", "b", "c"])})
    model = fitted("exposed + ward", frame, rng.random(n) < 0.3, ["exposed"])
    result = overlap.check(model)
    assert result.statistics["outside_records"] == int((ward == "c").sum())
    assert "for some of them entirely" in result.line
    # Without ward c the model is that of the other wards
    rest = frame[ward != "c"].copy()
    X = np.column_stack([np.ones(len(rest)), rest["exposed"] == "yes", rest["ward"] == "b"]).astype(float)
    expected = sm.Logit(model.held.event[ward != "c"].astype(float), X).fit(disp=0).params[1]
    assert np.log(result.statistics["exposure_odds_ratio_within_overlap"]) == pytest.approx(expected, abs=1e-6)


def test_groups_that_never_meet_leave_no_odds_ratio() -> None:
    rng = np.random.default_rng(12)
    age = rng.uniform(20, 80, 300)
    frame = pd.DataFrame({"exposed": yes_no(age > 50), "age": age})
    result = overlap.check(fitted("exposed + age", frame, rng.random(300) < 0.4, ["exposed"]))
    assert result.verdict == "caution"
    assert result.statistics["exposure_odds_ratio_within_overlap"] is None
    assert result.line.startswith("For nearly all of the records")


def test_each_level_stands_against_the_reference() -> None:
    frame = birth_weights()
    result = overlap.check(fitted("race + age + lwt + smoke", frame, frame["low"] == 1, ["race"]))
    assert [row[1:3] for row in result.tables[0].rows] == [("black", "white"), ("other", "white")]
    white = (frame["race"] == "white").sum()
    for row, level in zip(result.tables[0].rows, ("black", "other"), strict=True):
        assert row[3] == white + (frame["race"] == level).sum()
    assert len(result.figures) == 2


def test_a_number_exposure_by_the_variance_left_to_it() -> None:
    frame = birth_weights()
    result = overlap.check(fitted("lwt + age + race", frame, frame["low"] == 1, ["lwt"]))
    X = np.column_stack([np.ones(len(frame)), frame["age"], frame["race"] == "black", frame["race"] == "other"])
    expected = sm.OLS(frame["lwt"].to_numpy(), X.astype(float)).fit().rsquared
    assert result.statistics["exposure_variance_explained"] == pytest.approx(expected, rel=1e-9)
    assert result.verdict == "fine"
    assert "Lwt" in result.line


def test_grouped_counts_give_the_answers_of_single_records() -> None:
    frame = confounded()
    frame["age"] = np.round(frame["age"] / 5) * 5
    names = ["exposed", "age", "score"]
    grouped = frame.groupby([*names, "y"], observed=True).size().reset_index(name="n")
    for exposure in ("exposed", "age"):
        single = overlap.check(fitted("exposed + age + score", frame[names], frame["y"], [exposure]))
        again = overlap.check(
            fitted("exposed + age + score", grouped[names], grouped["y"], [exposure], counts=grouped["n"])
        )
        assert again.line == single.line
        for name, value in single.statistics.items():
            assert again.statistics[name] == (None if value is None else pytest.approx(value, rel=1e-9))


def test_nothing_adjusted_for() -> None:
    frame = birth_weights()
    result = overlap.check(fitted("smoke", frame, frame["low"] == 1, ["smoke"]))
    assert result.verdict == "not applicable"
    assert set(result.reasons) == set(result.statistics)
