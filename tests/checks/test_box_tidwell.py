"""x log x beside straight lines against statsmodels."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import scipy.stats
import statsmodels.api as sm

from oddsmodel.checks import box_tidwell
from oddsmodel.model.fitted import FittedModel

sys.path.insert(0, str(Path(__file__).parent))
from asked_form import columns_of, log_likelihood
from form_models import birth_weights, fitted
from form_on_disk import on_disk, single_rows, ward_model


def table(model: FittedModel) -> dict[str, tuple[float, ...]]:
    result = box_tidwell.check(model)
    return {row[0]: row[1:] for row in result.tables[0].rows}


def test_likelihood_ratios_against_statsmodels() -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt + race + ftv", frame, frame["low"] == 1, ["smoke"])
    X = columns_of(model, frame)
    found = table(model)
    assert list(found) == ["Age", "Lwt", "Ftv"]
    for source, shift in (("age", 0.0), ("lwt", 0.0), ("ftv", 1.0)):
        x = frame[source].to_numpy() + shift
        statistic = 2 * (log_likelihood(frame["low"], np.column_stack([X, x * np.log(x)])) - model.fit.log_likelihood)
        row = found[source.capitalize()]
        assert row[0] == shift
        assert row[1] == pytest.approx(statistic, abs=1e-6)
        assert row[2] == pytest.approx(scipy.stats.chi2.sf(statistic, 1), abs=1e-6)


def powered(true: float, n: int = 20_000) -> tuple[pd.DataFrame, np.ndarray]:
    rng = np.random.default_rng(9)
    x = rng.uniform(1, 5, n).round(2)
    eta = -1 + 0.6 * ((x**true if true else np.log(x)) - (3**true if true else np.log(3)))
    frame = pd.DataFrame({"x": x, "a": pd.Categorical(rng.choice(["no", "yes"], n), ["no", "yes"])})
    return frame, rng.random(n) < 1 / (1 + np.exp(-eta))


@pytest.mark.parametrize("true", [0.5, 1.0, 1.5])
def test_power_of_a_first_step(true: float) -> None:
    frame, event = powered(true)
    model = fitted("a + x", frame, event, ["a"])
    (shift, _, _, power) = table(model)["X"]
    assert shift == 0.0
    # Box & Tidwell 1962: 1 + the coefficient of x log x by the slope of the line alone
    X = columns_of(model, frame)
    line = next(i for i, column in enumerate(model.design.columns) if column.kind == "number")
    x = frame["x"].to_numpy()
    added = sm.Logit(event.astype(float), np.column_stack([X, x * np.log(x)])).fit(disp=0, tol=1e-12)
    assert power == pytest.approx(1 + added.params[-1] / model.fit.coefficients[line], rel=1e-6)
    assert power == pytest.approx(true, abs=0.35)


def test_units_and_shift() -> None:
    frame, event = powered(0.5, 3000)
    one = table(fitted("a + x", frame, event, ["a"]))["X"]
    other = table(fitted("a + x", frame.assign(x=frame["x"] * 3000), event, ["a"]))["X"]
    assert other[1:] == pytest.approx(one[1:], rel=1e-6)
    moved = frame.assign(x=frame["x"] - 4.0)
    # values from -3 to 1: the middle nine tenths range over 3.6, so that the unit is 0.5 and the shift 3.5
    lowered = table(fitted("a + x", moved, event, ["a"]))["X"]
    assert lowered[0] == 3.5
    raised = fitted("a + x", moved.assign(x=moved["x"] + 3.5), event, ["a"])
    assert lowered[1] == pytest.approx(table(raised)["X"][1], abs=1e-7)


def test_flat_lines_point_to_no_power_and_words_stand_in() -> None:
    rng = np.random.default_rng(1)
    n = 400
    frame = pd.DataFrame({"x": rng.uniform(1, 5, n), "a": pd.Categorical(rng.choice(["no", "yes"], n), ["no", "yes"])})
    result = box_tidwell.check(fitted("a + x", frame, rng.random(n) < 0.4, ["a"]))
    assert result.tables[0].rows[0][4] is None
    assert "less than two standard errors" in result.tables[0].note
    none = box_tidwell.check(fitted("a + log(x)", frame, rng.random(n) < 0.4, ["a"]))
    assert none.verdict == "not applicable"
    assert none.reasons["smallest_p"]
    assert "X as log(x) enters as a function" in none.explanation


def test_the_same_on_disk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    monkeypatch.setattr("oddsmodel.checks.nearby.PART_LEAVES", 2)
    model = ward_model(17_000, "exposure + ward + age + stay")
    result = box_tidwell.check(on_disk(model, tmp_path / "rows"))
    assert result == box_tidwell.check(model)
    X, event = columns_of(model, model.held.frame), model.held.event
    for row, source in zip(result.tables[0].rows, ("age", "stay"), strict=True):
        x = model.held.frame[source].to_numpy()
        statistic = 2 * (log_likelihood(event, np.column_stack([X, x * np.log(x)])) - model.fit.log_likelihood)
        assert row[2] == pytest.approx(statistic, abs=1e-5)
    assert result.verdict == "look"
    assert "fits better than the straight line of Age" in result.explanation
