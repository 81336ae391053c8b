"""The exposure's odds ratio over subsets of the adjustment columns against statsmodels."""

from __future__ import annotations

import itertools
import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import statsmodels.api as sm

from oddsmodel.checks import specification_stability
from oddsmodel.checks.subsets import fit_subsets, subsets_of
from oddsmodel.disclosure.spread import disclosed_spread
from oddsmodel.report.figures import svg

sys.path.insert(0, str(Path(__file__).parent))
from form_models import birth_weights, fitted
from form_on_disk import on_disk, single_rows, ward_model

COLUMNS = ("age", "lwt", "race", "ht")


def reference(frame: pd.DataFrame) -> dict[tuple[str, ...], float]:
    """The odds ratio of smoking by statsmodels, adjusted for every subset of the columns."""
    made = {name: frame[[name]].to_numpy(float) for name in ("age", "lwt")}
    made["race"] = np.column_stack([frame["race"] == level for level in ("black", "other")]).astype(float)
    made["ht"] = (frame["ht"] == "yes").to_numpy(float)[:, None]
    smoke, y = (frame["smoke"] == "yes").to_numpy(float), frame["low"].to_numpy()
    found = {}
    for size in range(len(COLUMNS) + 1):
        for names in itertools.combinations(COLUMNS, size):
            X = np.column_stack([np.ones(len(y)), smoke, *(made[name] for name in names)])
            found[names] = float(np.exp(sm.Logit(y, X).fit(disp=0, tol=1e-12).params[1]))
    return found


def test_every_subset_against_statsmodels() -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt + race + ht", frame, frame["low"] == 1, ["smoke"])
    expected = reference(frame)
    result = specification_stability.check(model)
    (figure,) = result.figures
    assert figure.estimates == pytest.approx(sorted(expected.values()), rel=1e-7)
    assert figure.alone == pytest.approx(expected[()], rel=1e-7)
    assert figure.reported == pytest.approx(expected[COLUMNS], rel=1e-7)
    adjusted = [value for names, value in expected.items() if names]
    assert result.statistics["choices"] == 15
    assert result.statistics["smallest_odds_ratio"] == pytest.approx(min(adjusted), rel=1e-7)
    assert result.statistics["largest_odds_ratio"] == pytest.approx(max(adjusted), rel=1e-7)
    ranges, without = result.tables
    assert ranges.rows[0][4] == pytest.approx(np.exp(np.median(np.log(adjusted))), rel=1e-7)
    assert [row[0] for row in without.rows] == ["nothing", "Age", "Lwt", "Race", "Ht"]
    for name, row in zip(COLUMNS, without.rows[1:], strict=True):
        rest = tuple(other for other in COLUMNS if other != name)
        assert row[1] == pytest.approx(expected[rest], rel=1e-7)
    assert "not their uncertainty" in result.explanation
    assert "not the uncertainty" in ranges.note


def test_a_term_goes_with_each_of_its_columns_and_levels_hold_the_constant() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    model = fitted("race + smoke + age * lwt - 1", frame, low, ["smoke"])
    assert model.adjustment == ("race", "age", "lwt")
    kept = np.array([[True, False, True], [False, True, True]])
    first, second = fit_subsets(model, kept)
    smoke = next(i for i, column in enumerate(model.design.columns) if column.role == "exposure")
    s, y = (frame["smoke"] == "yes").to_numpy(float), frame["low"].to_numpy()
    race = np.column_stack([frame["race"] == level for level in ("black", "other")]).astype(float)
    one = sm.Logit(y, np.column_stack([np.ones(len(y)), s, race, frame["lwt"]])).fit(disp=0, tol=1e-12)
    age, lwt = frame["age"] - 23, (frame["lwt"] - 130) / 30
    other = sm.Logit(y, np.column_stack([np.ones(len(y)), s, age, lwt, age * lwt])).fit(disp=0, tol=1e-12)
    assert first[smoke] == pytest.approx(one.params[1], abs=1e-7)
    assert second[smoke] == pytest.approx(other.params[1], abs=1e-7)


def test_more_than_ten_columns_are_sampled_by_the_seed() -> None:
    rng = np.random.default_rng(7)
    n = 400
    frame = pd.DataFrame({f"x{k}": rng.normal(size=n) for k in range(12)})
    frame["a"] = pd.Categorical(rng.choice(["no", "yes"], n), ["no", "yes"])
    model = fitted("a + " + " + ".join(f"x{k}" for k in range(12)), frame, rng.random(n) < 0.4, ["a"])
    kept = subsets_of(model)
    assert kept.shape == (1000, 12)
    assert len(np.unique(kept, axis=0)) == 1000
    assert kept[0].all()
    assert not kept[1].any()
    # each column stays with a chance of one half: within five standard errors
    assert np.abs(kept[2:].mean(axis=0) - 0.5).max() < 5 * 0.5 / np.sqrt(998)
    assert (subsets_of(model) == kept).all()
    result = specification_stability.check(model)
    assert result.statistics["choices"] == 999
    assert "1000 were drawn" in result.explanation
    assert len(result.tables[1].rows) == 13


def test_all_and_none_come_first() -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt", frame, frame["low"] == 1, ["smoke"])
    assert subsets_of(model).tolist() == [[True, True], [False, False], [False, True], [True, False]]


def test_nothing_to_choose_from() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    for formula in ("smoke", "smoke + age"):
        result = specification_stability.check(fitted(formula, frame, low, ["smoke"]))
        assert result.verdict == "not applicable"
        assert "fewer than two" in result.reasons["choices"]
    spline = specification_stability.check(fitted("rcs(age, 3) + lwt + race", frame, low, ["age"]))
    assert "no single odds ratio" in spline.reasons["smallest_odds_ratio"]


def test_calendar_years_beside_their_square() -> None:
    rng = np.random.default_rng(4)
    n = 800
    year = rng.integers(1990, 2021, n).astype(float)
    a, x = rng.random(n) < 0.5, rng.normal(size=n)
    frame = pd.DataFrame({"a": pd.Categorical(np.where(a, "yes", "no"), ["no", "yes"]), "year": year, "x": x})
    event = rng.random(n) < 1 / (1 + np.exp(-(-1 + 0.003 * (year - 2005) ** 2 + 0.3 * a + 0.4 * x)))
    model = fitted("a + year + I(year**2) + x", frame, event, ["a"])
    assert model.fit.space.to_beta is not None
    away = (year - 2005) / 10
    table = specification_stability.check(model).tables[1]
    for row, columns in zip(table.rows[1:], ([x], [away, away**2]), strict=True):
        fit = sm.Logit(event.astype(float), np.column_stack([np.ones(n), a, *columns])).fit(disp=0, tol=1e-12)
        assert row[1] == pytest.approx(np.exp(fit.params[1]), rel=1e-6)


def test_the_same_on_disk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    monkeypatch.setattr("oddsmodel.checks.nearby.PART_LEAVES", 2)
    model = ward_model(17_000)
    result = specification_stability.check(model)
    assert specification_stability.check(on_disk(model, tmp_path / "rows")) == result
    assert [len(figure.estimates) for figure in result.figures] == [8, 8]


def test_drawing_and_disclosure() -> None:
    frame = birth_weights()
    (figure,) = specification_stability.check(
        fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"])
    ).figures
    drawn = svg(figure, "f")
    assert drawn.count("h0") == 8
    assert "as reported" in drawn
    assert "with no adjustment" in drawn
    assert disclosed_spread(figure, ()) == figure
    assert figure.alone is not None
    hidden = disclosed_spread(figure, [figure.alone * (1 + 1e-9)])
    assert hidden is not None
    assert hidden.alone is None
    assert len(hidden.estimates) == 7
    assert "with no adjustment" not in svg(hidden, "f")
    assert disclosed_spread(figure, [figure.reported]) is None
