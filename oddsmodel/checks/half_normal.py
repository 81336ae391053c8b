"""Half-normal plot: ordered deviance residuals among those of simulated outcomes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from oddsmodel.checks.refits import SameColumns
from oddsmodel.checks.residuals import pattern_residuals
from oddsmodel.checks.severity import severity
from oddsmodel.inference.recession_cone import single_threaded
from oddsmodel.model.fitted import FittedModel
from oddsmodel.passes import Leaf
from oddsmodel.passes.base import joined
from oddsmodel.randomness import generator
from oddsmodel.results.figures import EnvelopeFigure
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.wording import finding, say

Array = NDArray[np.float64]

NAME = "half_normal"

SIMULATIONS = 39
FEWEST_FITS = 19
"""Atkinson's number; the envelope of 39 is left at a given place one time in twenty, above or below."""

MOST_ROWS = 10_000
FEWEST = 10
DOUBT = 0.05

ALONE, RUNS = 50, 100
"""The largest residuals are points of their own; the others are gathered in so many runs of neighbours."""


def expected_order(number: int) -> Array:
    """Expected order statistics (number,) of absolute normal values, rising.

    The normal quantiles of (i + m − 1/8) / (2m + 1/2), i = 1 to m (Atkinson 1981, Biometrika 68:13-20; the
    constants from memory).

    >>> expected_order(2).round(2).tolist()
    [0.36, 1.09]
    """
    from scipy.special import ndtri

    rank = np.arange(1, number + 1)
    return np.asarray(ndtri((rank + number - 0.125) / (2.0 * number + 0.5)))


def extreme(curves: Array) -> tuple[Array, int]:
    """Each curve's (c,) largest standardised distance from the mean of all curves (c, m); and where the first's is.

    With as many standard deviations a place as curves differ there: the studentised maximum of Myllymäki, Mrkvička,
    Grabarnik, Seijo & Hahn 2017, Journal of the Royal Statistical Society B 79:381-404, section 4.
    """
    mean, spread = curves.mean(axis=0), curves.std(axis=0)
    distance = np.abs(curves - mean)
    scaled = np.divide(distance, spread, out=np.zeros_like(distance), where=spread > 1e-9 * np.maximum(mean, 1e-300))
    return scaled.max(axis=1), int(scaled[0].argmax())


def check(model: FittedModel) -> CheckResult:
    """Ordered absolute deviance residuals with an envelope of simulations (Atkinson 1981, Biometrika 68:13-20).

    Outcomes are drawn 39 times from the fitted probabilities and the model fitted to each. p: the share of curves, the
    observed one among them, that are somewhere at least as far out as the observed one (Barnard 1963; Besag & Clifford
    1989). At most "look".
    """
    reason = _left_out(model)
    if reason is not None:
        return _not_applicable(reason)
    rows = joined(list(model.rows.passes.each(_linear, model.fit.coefficients)))
    counts = rows["trials"] if "trials" in rows else np.ones_like(rows["events"])
    held = np.flatnonzero(counts)
    if held.size - model.fit.dimension < FEWEST:
        return _not_applicable(say("half-normal-few-patterns", patterns=held.size, fewest=FEWEST))
    observed = pattern_residuals(rows, np.ones(1))
    trials = np.tile(counts.round().astype(np.int64), (SIMULATIONS, 1))
    drawn = np.stack(
        [
            generator(model.seed, "half-normal plot", model.name, number).binomial(one, observed.probability)
            for number, one in enumerate(trials)
        ]
    )
    with single_threaded():
        fits = SameColumns(model).linear(drawn, trials)
    size = np.abs(observed.deviance[held])
    order = np.argsort(size, kind="stable")
    curves = [size[order]]
    for events, linear in zip(drawn, fits, strict=True):
        if linear is not None:
            again: Leaf = {"X": linear[:, None], "events": events.astype(np.float64), "trials": counts}
            curves.append(np.sort(np.abs(pattern_residuals(again, np.ones(1)).deviance[held])))
    fitted = len(curves) - 1
    if fitted < FEWEST_FITS:
        return _not_applicable(say("half-normal-few-fits", fitted=fitted, simulations=SIMULATIONS))
    return _result(np.stack(curves), counts[held][order])


def _linear(rows: Leaf, first: int, coefficients: Array) -> Leaf:
    """The rows with their linear predictor as the only column."""
    counts: Leaf = {name: rows[name] for name in ("events", "trials") if name in rows}
    return {**counts, "X": (rows["X"] @ coefficients)[:, None]}


def _left_out(model: FittedModel) -> str | None:
    if model.grouping is not None:
        return say("no-check-of-grouped-records")
    if model.study_design == "matched case-control":
        return say("goodness-matched")
    if model.rows.number > MOST_ROWS:
        return say("half-normal-many-rows", simulations=SIMULATIONS, rows=model.rows.number, most=MOST_ROWS)
    return None


def _not_applicable(reason: str) -> CheckResult:
    nothing = dict.fromkeys(("simulations", "p", "share_outside"))
    return CheckResult(
        name=NAME,
        family="fit",
        title=say("half-normal-title"),
        verdict="not applicable",
        line=reason,
        statistics=nothing,
        reasons=dict.fromkeys(nothing, reason),
        explanation=say("half-normal-explanation"),
    )


def _result(curves: Array, records: Array) -> CheckResult:
    """curves (1 + k, m): ordered residuals, the observed ones first. records (m,): of the observed ones' patterns."""
    simulated = curves[1:]
    distance, place = extreme(curves)
    p = float((distance >= distance[0] * (1.0 - 1e-9)).mean())
    slack = 1e-9 * np.maximum(curves[0], 1e-300)
    outside = (curves[0] < simulated.min(axis=0) - slack) | (curves[0] > simulated.max(axis=0) + slack)
    verdict: Verdict = "fine" if p > DOUBT else "look"
    facts = {
        "simulations": len(simulated),
        "p": p,
        "above": bool(curves[0][place] > curves[:, place].mean()),
    }
    return CheckResult(
        name=NAME,
        family="fit",
        title=say("half-normal-title"),
        verdict=verdict,
        line=say("half-normal-line", **facts),
        statistics={"simulations": len(simulated), "p": p, "share_outside": float(outside.mean())},
        findings=() if verdict == "fine" else (finding(severity(verdict), "half-normal-line", **facts),),
        figures=(_figure(curves, records),),
        explanation=say("half-normal-explanation"),
    )


def _figure(curves: Array, records: Array) -> EnvelopeFigure:
    number = records.size
    gathered = max(0, number - ALONE)
    starts = np.unique(np.linspace(0, gathered, min(RUNS, gathered), endpoint=False).astype(np.int64))
    starts = np.concatenate([starts, np.arange(gathered, number)])
    lengths = np.diff(starts, append=number)

    def means(values: Array) -> tuple[float, ...]:
        return tuple((np.add.reduceat(values, starts) / lengths).tolist())

    simulated = curves[1:]
    return EnvelopeFigure(
        id=NAME,
        title=say("half-normal-title"),
        alt=say("half-normal-alt", patterns=number, simulations=len(simulated)),
        x_label=say("half-normal-axis-expected"),
        y_label=say("half-normal-axis-observed"),
        x=means(expected_order(number)),
        observed=means(curves[0]),
        middle=means(simulated.mean(axis=0)),
        lower=means(simulated.min(axis=0)),
        upper=means(simulated.max(axis=0)),
        values=tuple(lengths.tolist()),
        records=tuple(np.add.reduceat(records, starts).round().astype(int).tolist()),
    )
