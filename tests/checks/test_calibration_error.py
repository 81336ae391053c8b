"""Errors of calibration, Spiegelhalter's test and the parts of the Brier score, each computed in another way."""

from __future__ import annotations

import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import statsmodels.api as sm
from scipy.special import expit
from scipy.stats import chi2
from sklearn.metrics import brier_score_loss
from statsmodels.nonparametric.smoothers_lowess import lowess

from oddsmodel.checks import calibration_error
from oddsmodel.checks.brier_parts import BrierParts, brier_parts
from oddsmodel.checks.calibration_error import calibration_errors, check, smooth_with_band
from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.probability_groups import OrderedRecords, sorted_records
from oddsmodel.checks.smooth import smooth_share
from oddsmodel.checks.spiegelhalter import spiegelhalter

sys.path.insert(0, str(Path(__file__).parent))
from fit_models import grouped_model, record_model, simulated
from form_on_disk import on_disk, single_rows, ward_model
from grouped_models import grouped


def ordered_of(probability: np.ndarray, outcome: np.ndarray) -> OrderedRecords:
    return sorted_records({"linear": np.log(probability / (1 - probability)), "events": outcome})


def test_distances_are_those_of_lowess_at_every_record() -> None:
    """Against statsmodels' lowess without robust steps, evaluated at the records, and numpy's quantiles."""
    rng = np.random.default_rng(0)
    p = np.sort(rng.uniform(0.05, 0.9, 450))
    y = (rng.random(450) < p**2).astype(float)
    found = calibration_errors(ordered_of(p, y))
    assert found is not None
    distance = np.abs(np.clip(lowess(y, p, frac=0.75, it=0, xvals=p), 0, 1) - p)
    assert found.integrated == pytest.approx(distance.mean(), abs=1e-3)
    assert found.median == pytest.approx(np.quantile(distance, 0.5), abs=2e-3)
    assert found.ninetieth == pytest.approx(np.quantile(distance, 0.9), abs=2e-3)
    assert found.largest == pytest.approx(distance.max(), abs=2e-3)


def test_bins_change_the_distances_little_and_counts_are_repeated_records() -> None:
    rng = np.random.default_rng(2)
    p = rng.beta(2, 6, 20_000)
    y = (rng.random(p.size) < p**1.3).astype(float)
    ordered = ordered_of(p, y)
    found = calibration_errors(ordered)
    assert found is not None
    smooth = np.interp(np.sort(p), *np.array(smooth_share(ordered.probability, ordered.records, ordered.events)).T)
    inner = slice(200, -200)
    assert found.integrated == pytest.approx(np.abs(smooth - np.sort(p))[inner].mean(), abs=2e-3)
    coarse = np.round(p, 2)
    coarse[coarse == 0] = 0.01
    together, apart = ordered_of(coarse, y), ordered_of(coarse[:3000], y[:3000])
    assert together.records.size < 100
    written = OrderedRecords(*(np.repeat(v / apart.records, apart.records.astype(int)) for v in vars(apart).values()))
    one, other = calibration_errors(apart), calibration_errors(written)
    assert one is not None
    assert other is not None
    assert one.integrated == pytest.approx(other.integrated, abs=2e-3)


def test_what_chance_gives_is_the_mean_over_outcomes_drawn_from_the_probabilities() -> None:
    rng = np.random.default_rng(4)
    p = np.sort(rng.uniform(0.1, 0.8, 400))
    drawn = [calibration_errors(ordered_of(p, (rng.random(400) < p).astype(float))) for _ in range(150)]
    mean = np.mean([one.integrated for one in drawn if one is not None])
    assert drawn[0] is not None
    assert drawn[0].by_chance == pytest.approx(mean, rel=0.1)


def test_the_band_is_as_wide_as_the_curve_varies() -> None:
    rng = np.random.default_rng(5)
    p = np.sort(rng.uniform(0.1, 0.7, 300))
    truth = p**1.5 + 0.1
    curves, bands = [], []
    for _ in range(100):
        smooth, band = smooth_with_band(ordered_of(p, (rng.random(300) < truth).astype(float)), 0.95)
        curves.append([point[1] for point in smooth])
        bands.append([(upper - lower) / (2 * 1.959964) for _, lower, upper in band])
    assert np.mean(bands, axis=0) == pytest.approx(np.std(curves, axis=0), rel=0.3)


def test_the_curve_of_the_band_is_the_smooth_curve() -> None:
    rng = np.random.default_rng(6)
    p = np.sort(rng.uniform(0.1, 0.7, 300))
    ordered = ordered_of(p, (rng.random(300) < p).astype(float))
    smooth, band = smooth_with_band(ordered, 0.9)
    assert smooth == smooth_share(ordered.probability, ordered.records, ordered.events)
    assert all(lower <= point[1] <= upper for point, (_, lower, upper) in zip(smooth, band, strict=True))
    assert smooth_with_band(ordered_of(p[:20], np.zeros(20)), 0.9) == ((), ())


def by_hand(p: np.ndarray, y: np.ndarray, group: np.ndarray) -> list[float]:
    """The parts of Stephenson, Coelho & Jolliffe 2008 from their definitions, sums over single records."""
    n, share = y.size, y.mean()
    parts = np.zeros(5)
    parts[2] = share * (1 - share)
    for one in np.unique(group):
        pk, yk = p[group == one], y[group == one]
        parts[0] += pk.size * (pk.mean() - yk.mean()) ** 2 / n
        parts[1] += pk.size * (yk.mean() - share) ** 2 / n
        parts[3] += ((pk - pk.mean()) ** 2).sum() / n
        parts[4] += 2 * ((yk - yk.mean()) * (pk - pk.mean())).sum() / n
    return parts.tolist()


@pytest.mark.parametrize("digits", [8, 1])
def test_brier_parts_from_their_definitions_and_their_sum(digits: int) -> None:
    rng = np.random.default_rng(7)
    p = np.clip(np.round(rng.uniform(0.02, 0.95, 700), digits), 0.05, 0.95)
    y = (rng.random(700) < p**1.4).astype(float)
    ordered = ordered_of(p, y)
    edges = np.cumsum(ordered.tenths.records)
    group = np.empty(700, dtype=int)
    group[np.argsort(p, kind="stable")] = np.searchsorted(edges, np.arange(700), side="right")
    found = brier_parts(ordered.tenths, float(((p - y) ** 2).sum()))
    assert found.score == pytest.approx(brier_score_loss(y, p), rel=1e-12)
    assert list(found)[1:] == pytest.approx(by_hand(p, y, group), rel=1e-9, abs=1e-12)
    assert total(found) == pytest.approx(found.score, rel=1e-12)


def total(parts: BrierParts) -> float:
    added = parts.reliability - parts.resolution + parts.uncertainty
    return added + parts.within_variance - parts.within_covariance


def test_spiegelhalter_is_the_score_test_of_the_weights_as_a_further_column() -> None:
    """With what the columns explain taken out it is Rao's score test of adding 1 − 2p: statsmodels' `score_test`."""
    X, y = simulated(400, [-0.7, 0.8, 0.3], seed=11)
    model = record_model(X, y)
    found = spiegelhalter(model.fit)
    assert found is not None
    fit = sm.GLM(y, X, family=sm.families.Binomial()).fit(tol=1e-14)
    p = fit.fittedvalues
    statistic, value, _ = fit.model.score_test(fit.params, exog_extra=(1 - 2 * p)[:, None])
    assert found.z**2 == pytest.approx(np.squeeze(statistic), rel=1e-6)
    assert found.p == pytest.approx(np.squeeze(value), rel=1e-6)
    assert found.p == pytest.approx(chi2.sf(found.z**2, 1), rel=1e-9)
    # The formula itself, by weighted least squares; the usual form has a far larger variance.
    v, d = p * (1 - p), 1 - 2 * p
    r = sm.WLS(d, X, weights=v).fit().resid
    assert found.z == pytest.approx(((y - p) @ r) / np.sqrt(v @ r**2), rel=1e-6)
    assert v @ r**2 < 0.1 * (v @ d**2)
    assert found.skewness == pytest.approx((v * d) @ r**3 / (v @ r**2) ** 1.5, rel=1e-6)
    assert found.kurtosis == pytest.approx((v * (1 - 6 * v)) @ r**4 / (v @ r**2) ** 2, rel=1e-6)


def test_spiegelhalter_of_counted_records_is_that_of_single_ones() -> None:
    X, y = simulated(600, [-0.7, 0.8, 0.3], seed=12)
    X = np.round(X, 0)
    together = spiegelhalter(record_model(X, y).fit)
    apart = spiegelhalter(grouped_model(X, y).fit)
    assert together is not None
    assert apart is not None
    assert (together.z, together.kurtosis) == pytest.approx((apart.z, apart.kurtosis), rel=1e-7)


def test_nothing_is_tested_where_the_columns_explain_all_or_records_are_few() -> None:
    saturated = check(grouped_model([[1, 0], [1, 1]], [20, 35], [60, 60]))
    assert saturated.statistics["spiegelhalter_p"] is None
    assert "nothing is left" in saturated.reasons["spiegelhalter_z"]
    assert saturated.statistics["integrated"] is None
    assert "fewer than 10" in saturated.reasons["integrated"]
    assert saturated.statistics["score"] is not None
    X, y = simulated(40, [0.0, 0.7], seed=2)
    few = check(record_model(X, y))
    assert "not near normal" in few.reasons["spiegelhalter_p"]


def test_a_bent_relation_is_seen_and_a_straight_one_is_not() -> None:
    rng = np.random.default_rng(5)
    x = rng.normal(size=20_000)
    X = np.column_stack([np.ones(x.size), x])
    bent = check(record_model(X, (rng.random(x.size) < expit(-1 + 0.5 * x + 0.6 * x**2)).astype(float)))
    assert bent.verdict == "look"
    assert bent.findings[0].code == "calibration-error-seen"
    assert bent.statistics["integrated"] > 3 * bent.statistics["by_chance"]
    straight = check(record_model(X, (rng.random(x.size) < expit(-1 + 0.5 * x)).astype(float)))
    assert straight.verdict == "fine"
    assert straight.statistics["integrated"] < straight.statistics["by_chance"]
    assert straight.figures[0].band
    assert "by construction" in straight.explanation


@pytest.mark.parametrize("design", ["case-control", "matched case-control"])
def test_case_control_studies_have_none_of_it(design: str) -> None:
    X, y = simulated(300, [0.0, 0.7])
    result = check(record_model(X, y, design=design))
    assert result.verdict == "not applicable"
    assert set(result.statistics.values()) == {None}
    assert design in result.line
    assert result.figures == ()


def test_groups_have_no_test_and_no_band() -> None:
    result = check(grouped(n=400))
    assert result.statistics["spiegelhalter_p"] is None
    assert "independent" in result.reasons["spiegelhalter_p"]
    assert result.statistics["integrated"] is not None
    assert result.figures[0].band == ()


def test_one_outcome() -> None:
    every = check(grouped_model([[-1.0], [1.0]], [5, 5], [5, 5], exposed=(0,), intercept=False))
    assert every.verdict == "not applicable"
    assert "same outcome" in every.line


def test_rows_on_disk_and_classes_of_probability(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    model = ward_model(6000)
    one = check(model)
    single_rows(monkeypatch)
    filed = on_disk(ward_model(6000), tmp_path / "rows")
    assert check(filed).statistics == pytest.approx(one.statistics, rel=1e-7, abs=1e-10)
    monkeypatch.setattr("oddsmodel.checks.one_pass.MOST_SORTED", 100)
    classed = check(replace(filed, name="in classes"))
    assert one_pass(replace(filed, name="once more")).classed
    assert classed.statistics == pytest.approx(one.statistics, rel=1e-3, abs=1e-4)
    parts = BrierParts(*(classed.statistics[name] for name in BrierParts._fields))
    assert total(parts) == pytest.approx(parts.score, rel=1e-12)
    assert set(calibration_error.STATISTICS) == set(one.statistics)
