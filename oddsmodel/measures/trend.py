"""A trend over the levels of an ordered column: its scores as one number in place of the levels."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from oddsmodel.design.words import number_text
from oddsmodel.inference import Fit, Problem, likelihood_ratio, maximise_all, profile
from oddsmodel.inference.clustered import clustered_covariance, small_sample_factor
from oddsmodel.inference.penalised import maximise_penalised
from oddsmodel.inference.penalised_profile import profile_penalised
from oddsmodel.likelihood import JeffreysPenalisedLikelihood
from oddsmodel.measures.counts import level_columns
from oddsmodel.measures.intervals import lead_interval
from oddsmodel.measures.levels import REFERENCE
from oddsmodel.measures.one_contrast import contrast_result
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.study import CoefficientResult, Role, TermTest, TrendResult
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say

TREND, DEPARTURE = "trend", "departure from trend"
SETTLED = ("converged", "no finite maximum")


@dataclass(frozen=True)
class _Spaces:
    """The spaces of one column's two smaller models, as bases (p, r) of the model's coefficients.

    with_score: the score in place of the levels, its coefficient last; without: neither.
    """

    column: str
    term: str
    scores: tuple[tuple[str, float], ...]
    with_score: Array
    without: Array

    @property
    def levels(self) -> int:
        """How many levels the model has."""
        return int(self.with_score.shape[0] - self.without.shape[1] + 1)


def trends(
    model: FittedModel, columns: Sequence[str], stated: Mapping[str, Sequence[float]] | None = None
) -> tuple[TrendResult, ...]:
    """The trend of each of some ordered columns of a fitted model, the other columns as they are.

    stated: the plan's scores by column, one for each of its levels in order; 0, 1, 2, ... where it has none.

    With score s_j of level j the trend model has log odds θ (s_j − s_reference) in place of the level's own
    coefficient, a subspace of the model's coefficients. Twice the differences of the log-likelihoods of the model
    without the column, the trend model and the model with the levels are the tests for trend (one degree of freedom)
    and for departure from it (levels − 2): the likelihood-ratio counterparts of Cochran (1954, Biometrics 10:417-451)
    and Armitage (1955, Biometrics 11:375-386). All smaller models of all columns are fitted in shared passes. The
    interval of exp θ is the profile-likelihood interval within the trend model. Where records belong to groups there is
    no likelihood: θ has a Wald interval that allows for them, and neither test is given.
    """
    stated = stated or {}
    spaces = {name: _spaces(model, name, stated.get(name)) for name in columns}
    asked = [one for one in spaces.values() if one is not None]
    problems = [Problem(basis) for one in asked for basis in (one.with_score, one.without)]
    fits = iter(maximise_all(model.likelihood, problems, near=model.fit) if problems else ())
    found: list[TrendResult] = []
    for name, one in spaces.items():
        found.append(_not_in_levels(model, name) if one is None else _trend(model, one, next(fits), next(fits)))
    return tuple(found)


def _spaces(model: FittedModel, name: str, stated: Sequence[float] | None) -> _Spaces | None:
    """None where the column enters in another way than by levels against a reference."""
    own = level_columns(model, name)
    designs = [model.design.columns[position] for position in own]
    met = [column for column in model.design.columns if name in column.sources]
    if not own or len(met) != len(own) or not all(column.shown for column in designs):
        return None
    levels = model.columns[name].levels
    scores = dict(zip(levels, map(float, range(len(levels)) if stated is None else stated), strict=True))
    p = len(model.design.columns)
    direction = np.zeros((p, 1))
    for position, column in zip(own, designs, strict=True):
        direction[position] = scores[str(column.level)] - scores[str(column.reference)]
    others = np.eye(p)[:, [position for position in range(p) if position not in own]]
    return _Spaces(name, designs[0].term, tuple(scores.items()), np.hstack([others, direction]), others)


def _trend(model: FittedModel, spaces: _Spaces, with_score: Fit, without: Fit) -> TrendResult:
    label = model.columns[spaces.column].label
    step, reason = _step(model, spaces, with_score, say("trend-step-label", label=label))
    extra = spaces.levels - 2
    if model.grouping is not None:
        reason_for_none = say("trend-of-grouped-records")
        departure = TermTest(DEPARTURE, max(0, extra), None, None, reason_for_none)
        trend = TermTest(TREND, 1, None, None, reason_for_none)
        return TrendResult(spaces.column, label, spaces.term, spaces.scores, step, trend, departure, reason)
    if extra > 0:
        departure = _test(DEPARTURE, model.fit, with_score, extra)
    else:
        departure = TermTest(DEPARTURE, 0, None, None, say("trend-two-levels"))
    trend = _test(TREND, with_score, without, 1)
    return TrendResult(spaces.column, label, spaces.term, spaces.scores, step, trend, departure, reason)


def _step(
    model: FittedModel, spaces: _Spaces, with_score: Fit, label: str
) -> tuple[CoefficientResult | None, str | None]:
    """The log odds ratio per unit of score with its intervals, from the trend model's own matrix."""
    if with_score.status != "converged":
        return None, say("trend-not-estimated", status=with_score.status)
    basis = spaces.with_score
    within, penalised = model.likelihood.transformed(basis), None
    if isinstance(within, JeffreysPenalisedLikelihood):
        penalised = maximise_penalised(within)
        fit = penalised.fit
    else:
        start: Array = np.asarray(np.linalg.lstsq(basis, with_score.coefficients, rcond=None)[0], dtype=np.float64)
        fit = maximise_all(within, [Problem(start=start)])[0]
    # The same space in other coordinates, so the search can only differ by rounding.
    if fit.status != "converged":
        return None, say("trend-not-estimated", status=fit.status)
    contrast = np.zeros((1, basis.shape[1]))
    contrast[0, -1] = 1.0
    limits = None
    if penalised is not None:
        limits = profile_penalised(penalised, contrast, model.level)
    elif model.grouping is None:
        limits = profile(fit, contrast, model.level)
    role: Role = "exposure" if spaces.column in model.exposures else "adjustment"
    estimate, error = float(fit.coefficients[-1]), _standard_error(model, fit)
    return contrast_result(estimate, error, limits, 0, model.level, term=spaces.term, role=role, label=label), None


def _standard_error(model: FittedModel, fit: Fit) -> tuple[float | None, int | None]:
    """That of the last coefficient of another model of the same records, with the degrees of freedom of its t."""
    grouping = model.grouping
    if grouping is None:
        return float(fit.standard_errors[-1]), None
    factor = small_sample_factor(grouping.number, model.records, fit.coefficients.size)
    if factor is None:
        return None, grouping.df
    held, patterns = model.grouped
    covariance = clustered_covariance(fit, patterns.index, held.event, grouping.codes, factor, held.counts)
    return float(np.sqrt(covariance[-1, -1])), grouping.df


def _test(name: str, larger: Fit, smaller: Fit, df: int) -> TermTest:
    if larger.status not in SETTLED or smaller.status not in SETTLED:
        return TermTest(name, df, None, None, say("trend-not-settled"))
    statistic, df, p = likelihood_ratio(larger, smaller)
    return TermTest(name, df, statistic, p)


def trends_withheld(model: FittedModel, columns: Sequence[str], reason: str) -> tuple[TrendResult, ...]:
    """The trends of some columns without any number, for one reason."""
    tests = TermTest(TREND, 1, None, None, reason), TermTest(DEPARTURE, 0, None, None, reason)
    return tuple(TrendResult(name, model.columns[name].label, "", (), None, *tests, reason) for name in columns)


def _not_in_levels(model: FittedModel, name: str) -> TrendResult:
    return trends_withheld(model, (name,), say("trend-not-plain-levels", label=model.columns[name].label))[0]


def trend_table(model: FittedModel, found: TrendResult, coefficients: Sequence[CoefficientResult]) -> Table:
    """The levels with their scores and odds ratios, then the odds ratio per step and the two p-values.

    coefficients: those of the model, in the order of its matrix.
    """
    percent = f"{round(100 * model.level, 1):g}%"
    columns = (
        TableColumn("label", "Level"),
        TableColumn("score", "Score", "number"),
        TableColumn("odds_ratio", "Odds ratio", "odds_ratio"),
        TableColumn("interval", f"{percent} interval", "interval"),
        TableColumn("p", "p-value, likelihood ratio" if model.grouping is None else "p-value, Wald", "p"),
    )
    own = {one.level: one for one in coefficients if one.level is not None and one.term == found.term}
    references = {one.reference for one in own.values()}
    rows: list[tuple[Cell, ...]] = []
    for level, score in found.scores:
        one = own.get(level)
        if one is not None:
            rows.append((f"{found.label}: {level}", score, one.odds_ratio, lead_interval(one.profile, one.wald), None))
        elif level in references:
            rows.append((f"{found.label}: {level}", score, REFERENCE, None, None))
    step = found.step
    estimate: tuple[Cell, ...] = (None, None)
    if step is not None:
        estimate = (step.odds_ratio, lead_interval(step.profile, step.wald))
    p = found.trend.p if model.grouping is None or step is None else step.wald.p
    rows.append((say("trend-row-step"), None, *estimate, p))
    rows.append((say("trend-row-departure"), None, None, None, found.departure.p))
    reasons = dict.fromkeys(reason for reason in (found.reason, found.trend.reason, found.departure.reason) if reason)
    note = say(
        "trend-note",
        scores=", ".join(number_text(score) for _, score in found.scores),
        reason=" ".join(reasons),
        adjustment=found.column not in model.exposures,
        likelihood=model.grouping is None,
    )
    blocks = (*(0,) * (len(rows) - 2), 1, 1)
    return Table(f"trend_{found.column}", say("trend-title", label=found.label), columns, tuple(rows), note, blocks)
