"""Quantile groups in place of straight lines and beside them, against pandas and statsmodels."""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import scipy.stats
import statsmodels.api as sm

from oddsmodel.checks import quantile_groups
from oddsmodel.checks.curves import straight_lines
from oddsmodel.checks.quantile_groups import grouped
from oddsmodel.disclosure.curve import coarsen_curve
from oddsmodel.report.figures import svg

sys.path.insert(0, str(Path(__file__).parent))
from asked_form import columns_of, log_likelihood
from form_models import birth_weights, fitted
from form_on_disk import on_disk, single_rows, ward_model


def test_fifths_against_pandas_and_statsmodels() -> None:
    frame = birth_weights()
    model = fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"])
    result = quantile_groups.check(model)
    X, y = columns_of(model, frame), frame["low"].to_numpy()
    tests, groups = result.tables
    for source, row in zip(("age", "lwt"), tests.rows, strict=True):
        position = next(i for i, column in enumerate(model.design.columns) if column.sources == (source,))
        x = frame[source].to_numpy()
        cuts = np.quantile(x, [0.2, 0.4, 0.6, 0.8])
        own = np.searchsorted(cuts, x, side="right")
        reference = int(np.searchsorted(cuts, np.median(x), side="right"))
        dummies = np.column_stack([own == k for k in range(5) if k != reference]).astype(float)
        statistic = 2 * (log_likelihood(y, np.column_stack([X, dummies])) - model.fit.log_likelihood)
        assert row[1:4] == (5, pytest.approx(statistic, abs=1e-6), 4)
        assert row[4] == pytest.approx(scipy.stats.chi2.sf(statistic, 4), abs=1e-7)
        fit = sm.Logit(y, np.column_stack([np.delete(X, position, axis=1), dummies])).fit(disp=0, tol=1e-12)
        rows = [cells for cells in groups.rows if cells[0] == source.capitalize()]
        assert [cells[2] for cells in rows] == np.bincount(own).tolist()
        assert [cells[3] for cells in rows] == pytest.approx([np.median(x[own == k]) for k in range(5)])
        assert rows[reference][4] == "1 (reference)"
        others = [cells for k, cells in enumerate(rows) if k != reference]
        limits = np.exp(fit.conf_int()[-4:])
        assert [cells[4] for cells in others] == pytest.approx(np.exp(fit.params[-4:]), rel=1e-6)
        assert [cells[5].lower for cells in others] == pytest.approx(limits[:, 0], rel=1e-6)
        assert [cells[5].upper for cells in others] == pytest.approx(limits[:, 1], rel=1e-6)
        slope = model.fit.coefficients[position]
        middle = rows[reference][3]
        assert [cells[6] for cells in others] == pytest.approx([np.exp(slope * (c[3] - middle)) for c in others])


def test_tenths_with_many_events_and_points_over_the_line() -> None:
    model = ward_model(6000, "exposure + ward + age + log(stay)")
    result = quantile_groups.check(model)
    assert [row[1] for row in result.tables[0].rows] == [10, 10]
    assert result.verdict == "look"
    assert "straight line of Age" in result.explanation
    figure = result.figures[0]
    assert figure.curve == figure.lower == figure.upper == ()
    assert len(figure.points) == 10
    reference = next(point for point in figure.points if point.lower is None)
    assert (reference.x, reference.ratio) == (figure.reference, 1.0)
    assert sum(point.records for point in figure.points) == 6000
    assert svg(figure, "f").count("<circle") == 10 + 1 + 2  # points, the reference, and samples of both in the key


def test_disclosure_keeps_points_of_many_records_at_round_values() -> None:
    figure = quantile_groups.check(ward_model(3000, "exposure + ward + age")).figures[0]
    coarse = coarsen_curve(figure, 10)
    assert coarse is not None
    assert len(coarse.points) == len(figure.points)
    for one, other in zip(figure.points, coarse.points, strict=True):
        assert (one.ratio, one.upper) == (other.ratio, other.upper)
        assert other.x == round(other.x, 1) or abs(other.x - one.x) < 1
    small = figure.points[0].records
    assert coarsen_curve(figure, small) is not None
    hidden = coarsen_curve(figure, max(point.records for point in figure.points) + 1)
    assert hidden is None


def test_values_that_pile_up_and_few_events() -> None:
    frame = birth_weights()
    low = frame["low"] == 1
    model = fitted("smoke + ftv + ptl", frame, low, ["smoke"])
    ftv, ptl = straight_lines(model)
    assert grouped(ftv, 5).cuts.tolist() == [1.0, 2.0]
    assert grouped(ptl, 5) is None
    result = quantile_groups.check(model)
    assert "Ptl has its values piled up" in result.explanation
    assert [row[0] for row in result.tables[0].rows] == ["Ftv"]
    few = quantile_groups.check(fitted("smoke + age", frame.iloc[:100], np.arange(100) % 4 == 0, ["smoke"]))
    assert few.verdict == "not applicable"
    assert "too few" in few.reasons["smallest_p"]


def test_a_value_a_group_holds_the_line() -> None:
    rng = np.random.default_rng(5)
    x = rng.choice([1.0, 2.0, 3.0, 4.0, 5.0], 1500)
    frame = pd.DataFrame({"x": x, "a": pd.Categorical(rng.choice(["no", "yes"], 1500), ["no", "yes"])})
    event = rng.random(1500) < 1 / (1 + np.exp(-(-2 + 0.3 * x)))
    model = fitted("a + x", frame, event, ["a"])
    (row,) = quantile_groups.check(model).tables[0].rows
    X = columns_of(model, frame)
    dummies = np.column_stack([x == k for k in (1, 2, 4, 5)]).astype(float)
    position = next(i for i, column in enumerate(model.design.columns) if column.kind == "number")
    full = log_likelihood(event, np.column_stack([np.delete(X, position, axis=1), dummies]))
    assert row[2:4] == (pytest.approx(2 * (full - model.fit.log_likelihood), abs=1e-6), 3)


def test_a_group_without_events_has_no_odds_ratio() -> None:
    rng = np.random.default_rng(8)
    x = rng.uniform(0, 10, 600)
    event = (x > 2.2) & (rng.random(600) < 0.3)
    frame = pd.DataFrame({"x": x, "a": pd.Categorical(rng.choice(["no", "yes"], 600), ["no", "yes"])})
    result = quantile_groups.check(fitted("a + x", frame, event, ["a"]))
    assert result.verdict == "not applicable"
    assert "one of these has no event" in result.explanation


def test_the_same_on_disk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    single_rows(monkeypatch)
    monkeypatch.setattr("oddsmodel.checks.nearby.PART_LEAVES", 2)
    model = ward_model(17_000)
    assert quantile_groups.check(on_disk(model, tmp_path / "rows")) == quantile_groups.check(model)
