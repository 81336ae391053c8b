"""Curves in place of straight lines against statsmodels fits on patsy's natural splines."""

from __future__ import annotations

import math
import sys
from pathlib import Path

import numpy as np
import pandas as pd
import patsy
import pytest
import scipy.stats
import statsmodels.api as sm

from oddsmodel.checks import linearity
from oddsmodel.checks.curves import choose_knots, fit_curves, straight_lines
from oddsmodel.checks.spread import Spread

sys.path.insert(0, str(Path(__file__).parent))
from form_models import birth_weights, fitted


def natural_spline(x: np.ndarray, knots: np.ndarray) -> np.ndarray:
    """patsy's natural cubic spline with these knots, the outer ones as its bounds: the same space as ours with 1."""
    spline = "cr(x, knots=inner, lower_bound=first, upper_bound=last) - 1"
    given = {"x": x, "inner": knots[1:-1], "first": knots[0], "last": knots[-1]}
    return np.asarray(patsy.dmatrix(spline, given))


def harrell(x: np.ndarray) -> np.ndarray:
    """Harrell 2001, table 2.3, four knots (from memory)."""
    return np.quantile(x, [0.05, 0.35, 0.65, 0.95])


def reference_curve(X: np.ndarray, position: int, y: np.ndarray) -> tuple[float, np.ndarray]:
    """Likelihood ratio of a curve for one column of X, and the other columns' coefficients, by statsmodels."""
    others = np.delete(X, [0, position], axis=1)
    bent = np.column_stack([others, natural_spline(X[:, position], harrell(X[:, position]))])
    full, line = sm.Logit(y, bent).fit(disp=0, maxiter=100), sm.Logit(y, X).fit(disp=0, maxiter=100)
    return 2 * (full.llf - line.llf), full.params


def test_likelihood_ratios_agree_with_patsy_and_statsmodels() -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"])
    X = model.design.encode(frame)
    y = frame["low"].to_numpy()
    curves = fit_curves(model, straight_lines(model))
    assert [curve.line.source for curve in curves.fitted] == ["age", "lwt"]
    for curve in curves.fitted:
        statistic, params = reference_curve(X, curve.line.position, y)
        assert curve.statistic == pytest.approx(statistic, abs=1e-6)
        assert curve.df == 2
        assert curve.p == pytest.approx(scipy.stats.chi2.sf(statistic, 2), abs=1e-7)
        smoke = next(i for i, column in enumerate(model.design.columns) if column.role == "exposure")
        place = smoke - 1 - (curve.line.position < smoke)
        assert curve.coefficients[smoke] == pytest.approx(params[place], abs=1e-6)


def test_result_holds_curves_figures_and_a_table() -> None:
    frame = birth_weights()
    result = linearity.check(fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"]))
    assert result.statistics["curves"] == 2
    assert "moves from" in result.line or "stays at" in result.line
    assert "2 curves were looked at" in result.explanation
    assert [row[0] for row in result.tables[0].rows] == ["Age", "Lwt"]
    figure = result.figures[0]
    middle = int(np.argmin(np.abs(np.array(figure.x) - figure.reference)))
    assert figure.curve[middle] == pytest.approx(1, abs=0.05)
    assert all(low <= mid <= high for low, mid, high in zip(figure.lower, figure.curve, figure.upper, strict=True))
    assert len(figure.density) >= 10
    assert sum(records for _, _, records in figure.density) >= 0.9 * len(frame)


def bent_records(n: int, seed: int = 5) -> pd.DataFrame:
    rng = np.random.default_rng(seed)
    age = rng.uniform(20, 90, n)
    exposed = rng.random(n) < 1 / (1 + np.exp(-(((age - 55) / 18) ** 2 - 1.5)))
    log_odds = -2 + 0.9 * ((age - 55) / 18) ** 2 + 0.3 * exposed
    frame = pd.DataFrame({"age": age, "exposed": pd.Categorical(np.where(exposed, "yes", "no"), ["no", "yes"])})
    frame["y"] = rng.random(n) < 1 / (1 + np.exp(-log_odds))
    return frame


def test_a_bend_that_confounds_is_a_caution() -> None:
    frame = bent_records(3000)
    result = linearity.check(fitted("exposed + age", frame[["exposed", "age"]], frame["y"], ["exposed"]))
    assert result.verdict == "caution"
    (finding,) = result.findings
    assert (finding.severity, finding.code, finding.facts["column"]) == ("caution", "not-a-straight-line", "Age")
    assert finding.facts["after"] < finding.facts["before"] / 1.1
    assert "moves from" in finding.message
    assert result.statistics["exposure_odds_ratio_with_curves"] == pytest.approx(finding.facts["after"])


def test_a_straight_truth_is_fine_and_a_small_bend_in_many_records_too() -> None:
    rng = np.random.default_rng(11)
    n = 100_000
    x = np.round(rng.normal(size=n), 2)
    exposed = rng.random(n) < 0.4
    log_odds = -1 + 0.3 * x + 0.012 * x**2 + 0.4 * exposed
    frame = pd.DataFrame({"x": x, "exposed": pd.Categorical(np.where(exposed, "yes", "no"), ["no", "yes"])})
    model = fitted("exposed + x", frame, rng.random(n) < 1 / (1 + np.exp(-log_odds)), ["exposed"])
    result = linearity.check(model)
    assert result.verdict == "fine"
    assert 1 < result.statistics["largest_departure"] < 1.1


def test_departure_is_the_largest_ratio_over_the_middle_nine_tenths() -> None:
    frame = bent_records(3000)
    model = fitted("exposed + age", frame[["exposed", "age"]], frame["y"], ["exposed"])
    (curve,) = fit_curves(model, straight_lines(model)).fitted
    X = model.design.encode(frame)
    line = next(i for i, column in enumerate(model.design.columns) if column.kind == "number")
    _, params = reference_curve(X, line, frame["y"].to_numpy(float))
    x = frame["age"].to_numpy()
    low, mid, high = np.quantile(x, [0.05, 0.5, 0.95])
    grid = np.linspace(low, high, 101)
    knots = harrell(x)
    bend = (natural_spline(grid, knots) - natural_spline(np.array([mid]), knots)) @ params[1:]
    straight = sm.Logit(frame["y"].to_numpy(float), X).fit(disp=0).params[line] * (grid - mid)
    expected = math.exp(np.abs(bend - straight).max())
    assert linearity.check(model).statistics["largest_departure"] == pytest.approx(expected, rel=1e-6)
    assert curve.log_odds(grid, mid)[0] == pytest.approx(bend, abs=1e-6)


def test_a_bent_number_exposure_is_told_of_its_own_curve() -> None:
    frame = bent_records(3000)
    result = linearity.check(fitted("age + exposed", frame[["exposed", "age"]], frame["y"], ["age"]))
    assert result.verdict == "caution"
    assert "average over its range" in result.findings[0].message
    assert result.statistics["exposure_odds_ratio_with_lines"] is None
    assert result.reasons["exposure_odds_ratio_with_lines"]


def test_splines_powers_and_interactions_are_not_straight_lines_but_a_log_is() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    assert straight_lines(fitted("smoke + rcs(age, 3) + lwt * race", frame, low, ["smoke"])) == ()
    assert straight_lines(fitted("smoke + age + I(age**2)", frame, low, ["smoke"])) == ()
    lines = straight_lines(fitted("smoke + log(lwt)", frame, low, ["smoke"]))
    assert [line.label for line in lines] == ["Lwt as log(lwt)"]
    (figure,) = linearity.check(fitted("smoke + log(lwt)", frame, low, ["smoke"])).figures
    assert figure.x_label == "Lwt"
    assert figure.x[0] < figure.reference == frame["lwt"].median() < figure.x[-1]
    result = linearity.check(fitted("smoke + race", frame, low, ["smoke"]))
    assert result.verdict == "not applicable"
    assert result.statistics["smallest_p"] is None
    assert result.reasons["smallest_p"] == result.line


def test_few_values_and_piled_up_values() -> None:
    assert choose_knots(Spread.of(np.repeat([0.0, 1.0, 2.0, 3.0], 100))) == "linearity-few-values"
    assert choose_knots(Spread.of(np.r_[np.zeros(394), 1:7])) == "linearity-values-pile-up"
    zeros = np.r_[np.zeros(250), np.tile([1.0, 2.0, 3.0, 5.0, 8.0], 30)]
    assert choose_knots(Spread.of(zeros)) == pytest.approx([0, 3, 8])
    frame = birth_weights()
    model = fitted("smoke + ptl + age", frame, frame["low"] == 1, ["smoke"])
    result = linearity.check(model)
    assert result.statistics["curves"] == 1
    assert "Ptl has fewer than five distinct values" in result.explanation


def test_grouped_counts_give_the_answers_of_single_records() -> None:
    frame = bent_records(2000)
    frame["age"] = np.round(frame["age"] / 5) * 5
    single = linearity.check(fitted("exposed + age", frame[["exposed", "age"]], frame["y"], ["exposed"]))
    grouped = frame.groupby(["exposed", "age", "y"], observed=True).size().reset_index(name="n")
    again = linearity.check(
        fitted("exposed + age", grouped[["exposed", "age"]], grouped["y"], ["exposed"], counts=grouped["n"])
    )
    assert again.line == single.line
    for name, value in single.statistics.items():
        assert again.statistics[name] == pytest.approx(value, rel=1e-9)
    assert again.figures[0].density == single.figures[0].density


def test_a_handful_of_records_gives_words_and_no_wild_numbers() -> None:
    rng = np.random.default_rng(2)
    frame = pd.DataFrame({"x": np.arange(14.0), "a": pd.Categorical(["no", "yes"] * 7, ["no", "yes"])})
    y = rng.random(14) < 0.5
    result = linearity.check(fitted("a + x", frame, y, ["a"]))
    assert all(value is None or math.isfinite(value) for value in result.statistics.values())
    assert set(result.reasons) == {name for name, value in result.statistics.items() if value is None}
    for figure in result.figures:
        assert max(figure.upper) < 1e6
