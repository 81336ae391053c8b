"""What a shareable report of a separated model, or one by another method, must not give away."""

from __future__ import annotations

import itertools
import json
import math
import re
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from scipy import optimize, stats
from scipy.stats.contingency import odds_ratio

from oddsmodel.disclosure.gather import gather
from oddsmodel.results.tables import Hidden
from oddsmodel.study.run import RunOutcome

sys.path.insert(0, str(Path(__file__).parent.parent / "study"))
from method_runs import coefficient, report, run, table

WARDS = (("A", 40, 60), ("B", 3, 50), ("C", 0, 30), ("D", 25, 45))
"""Levels with events and others: few events in B, none in C."""

METHODS = ["", 'method = "penalised"', 'method = "log-F"\nprior = {m = 2, columns = ["ward"]}', 'method = "exact"']


def frame(wards: tuple[tuple[str, int, int], ...] = WARDS) -> pd.DataFrame:
    rows = [(ward, outcome, n) for ward, events, others in wards for outcome, n in (("yes", events), ("no", others))]
    return pd.DataFrame(rows, columns=["ward", "infected", "n"])


def shared(folder: Path, more: str, audience: str = "shareable") -> tuple[RunOutcome, dict[str, Any]]:
    levels = 'kind = "category"\nlevels = ["A", "B", "C", "D"]'
    counts = 'count = "n"'
    return run(folder, frame(), "ward", more, exposures=("ward",), records=counts, audience=audience, ward=levels)


def numbers(value: Any) -> Iterator[float]:
    if isinstance(value, dict | list):
        for one in value.values() if isinstance(value, dict) else value:
            yield from numbers(one)
    elif isinstance(value, float):
        yield value


def secrets() -> list[float]:
    """Numbers from which the events of B, or those of D with them, could be worked out: odds ratios against A by
    maximum likelihood, with a half added, conditional ones with their exact limits, and the limit of C."""
    (_, a, b), *others = WARDS
    found = []
    for _, c, d in others:
        if c:
            found.append(c * b / (a * d))
        found.append((c + 0.5) * (b + 0.5) / ((a + 0.5) * (d + 0.5)))
        conditional = odds_ratio([[c, d], [a, b]], kind="conditional")
        found += [conditional.statistic, *conditional.confidence_interval(0.95)]
    half = stats.chi2.ppf(0.95, 1) / 2
    best = a * math.log(a / (a + b)) + b * math.log(b / (a + b))

    def short(theta: float) -> float:
        def cost(alpha: float) -> float:
            return (a + b) * np.logaddexp(0, alpha) - a * alpha + 30 * np.logaddexp(0, alpha + theta)

        return half - best - float(optimize.minimize_scalar(cost, bracket=(-2, 0)).fun)

    found.append(math.exp(optimize.brentq(short, -15, 0)))
    ratios = [one for one in found if 0 < one < math.inf]
    return [*ratios, *(math.log(one) for one in ratios)]


@pytest.mark.parametrize("more", METHODS, ids=["none", "penalised", "log-F", "exact"])
def test_no_estimate_of_a_model_of_the_exposure_alone_leaves_with_a_hidden_count(tmp_path: Path, more: str) -> None:
    outcome, results = shared(tmp_path, more)
    kept = secrets()
    for number in numbers(results):
        assert all(abs(number - secret) > 1e-4 * abs(secret) for secret in kept), number
    for model in results["models"]:
        assert model["log_likelihood"] is None
        for one in model["coefficients"]:
            assert (one["odds_ratio"], one["profile"]["lower"], one["profile"]["upper"]) == (None, None, None)
            assert "exact" not in one
            assert "give away" in one["reasons"]["odds_ratio"]
    for path in (outcome.folder / "tables").glob("*.csv"):
        for cell in re.findall(r"-?\d+\.\d+(?:e-?\d+)?", path.read_text(encoding="utf-8")):
            assert all(abs(float(cell) - secret) > 1e-4 * abs(secret) for secret in kept), (path.name, cell)
    assert "at most" not in report(outcome)
    assert "Intercepts for predicted risks" not in report(outcome)


@pytest.mark.parametrize("more", ["", 'method = "exact"'])
def test_what_the_proof_says_is_known_and_protects_nothing(tmp_path: Path, more: str) -> None:
    """A reader who enumerates all tables with the counts shown, and knows that nobody of C had the event, is left with
    several values for the few events of B."""
    outcome, results = shared(tmp_path, more)
    (levels,) = [one for one in outcome.results.models[0].tables if one.id == "levels"]
    shown = [row[2] for row in levels.rows]
    assert shown[2] == 0
    assert isinstance(shown[1], Hidden)
    events = results["models"][0]["events"]
    assert events == 68
    limits = [range(events + 1) if isinstance(one, Hidden) else [one] for one in shown]
    possible = {cells[1] for cells in itertools.product(*limits) if sum(cells) == events}
    assert len(possible) > 10
    assert max(possible) >= 5


def test_a_zero_that_is_told_is_locked_in_the_system(tmp_path: Path) -> None:
    outcome, _ = shared(tmp_path, "", audience="internal")
    counts = gather(outcome.results, 5)
    zeros = {counts.places["cell", ("model", 0, 0), 2, 2]}
    assert zeros <= counts.locked
    assert counts.places["cell", ("model", 0, 0), 1, 2] not in counts.locked


def one_by_one() -> pd.DataFrame:
    """The wards record by record, with another column beside."""
    rng = np.random.default_rng(2)
    wide = frame().loc[frame().index.repeat(frame().n)].drop(columns="n").reset_index(drop=True)
    return wide.assign(dirty=np.where(rng.random(len(wide)) < 0.4, "yes", "no"))


def test_with_adjustment_the_limit_and_the_model_beside_stay(tmp_path: Path) -> None:
    ward = 'kind = "category"'
    _, results = run(tmp_path, one_by_one(), "ward + dirty", exposures=("ward",), audience="shareable", ward=ward)
    model, beside = results["models"]
    lost = coefficient(model, "ward", "C")
    assert lost["odds_ratio"] is None
    assert 0 < lost["profile"]["upper"] < 1
    assert coefficient(beside, "ward", "C")["odds_ratio"] is not None
    assert coefficient(model, "ward", "B")["crude"]["odds_ratio"] is None


@pytest.mark.parametrize("more", METHODS, ids=["none", "penalised", "log-F", "exact"])
def test_exposures_adjusted_for_one_another_alone_are_as_crude_ones(tmp_path: Path, more: str) -> None:
    """With nothing else adjusted for, the estimates of the levels with hidden counts go with these."""
    ward = 'kind = "category"'
    formula, both = "ward + dirty", ("ward", "dirty")
    outcome, results = run(tmp_path, one_by_one(), formula, more, exposures=both, audience="shareable", ward=ward)
    for model in results["models"]:
        for one in (coefficient(model, "ward", level) for level in "BCD"):
            assert (one["odds_ratio"], one["profile"]["lower"], one["profile"]["upper"]) == (None, None, None)
            assert "exact" not in one
        assert coefficient(model, "dirty")["odds_ratio"] is not None
    assert "at most" not in report(outcome)


def test_findings_on_sparse_data_say_no_estimate_that_is_hidden(tmp_path: Path) -> None:
    for audience in ("internal", "shareable"):
        (tmp_path / audience).mkdir()
        counts = 'count = "n"'
        cells = table(2, 11, 6, 6)
        outcome, results = run(tmp_path / audience, cells, "prophylaxis", records=counts, audience=audience)
        told = {one["code"]: one for one in results["models"][0]["findings"]}
        bias, apart = told["sparse-data-bias"], told["limits-disagree"]
        hidden = audience == "shareable"
        assert isinstance(bias["facts"]["plain"], str) == hidden
        assert isinstance(bias["facts"]["penalised"], str) == hidden
        assert isinstance(apart["facts"]["distance"], str) == hidden
        assert bool(re.search(r"0\.\d", bias["message"])) != hidden
        assert "noticeably" in bias["message"] or not hidden
        json.dumps(results)
        assert ("0.18" in report(outcome)) != hidden
