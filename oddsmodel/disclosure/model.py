"""One model's results with everything taken out that would give a small count away."""

from __future__ import annotations

from collections.abc import Container, Iterator
from dataclasses import replace

from oddsmodel.disclosure.calibration import coarsen_calibration
from oddsmodel.disclosure.curve import coarsen_curve
from oddsmodel.disclosure.envelope import coarsen_envelope
from oddsmodel.disclosure.findings import COUNTS, disclosed_finding, ends_with
from oddsmodel.disclosure.flow import disclosed_flow, disclosed_flow_figure
from oddsmodel.disclosure.gather import analysed_and_events
from oddsmodel.disclosure.hiding import Hiding
from oddsmodel.disclosure.histogram import coarsen_histogram
from oddsmodel.disclosure.precision import coarsen_precision
from oddsmodel.disclosure.scatter import coarsen_scatter
from oddsmodel.disclosure.spread import disclosed_spread
from oddsmodel.disclosure.steps import coarsen_steps
from oddsmodel.disclosure.table_counts import row_blocks, row_text
from oddsmodel.disclosure.tables import disclosed_table
from oddsmodel.results.figures import (
    CalibrationFigure,
    CurveFigure,
    EnvelopeFigure,
    EstimatesFigure,
    Figure,
    FlowFigure,
    HistogramFigure,
    PrecisionFigure,
    ScatterFigure,
    SpreadFigure,
    StepFigure,
)
from oddsmodel.results.study import (
    CheckResult,
    CoefficientResult,
    CrudeEstimate,
    Flow,
    ModelResult,
    ProfileResult,
    TermTest,
    TrendResult,
    WaldResult,
)
from oddsmodel.wording import say

CELLS = (*COUNTS, "cell", "cells", "count", "counts")
OF_ESTIMATES = ("trend_", "corrected_intercept")
"""How the identities of tables begin that hold nothing but estimates of the whole model."""

NUMBERS = ("log_odds_ratio", "standard_error", "odds_ratio", "wald", "profile")


TELL_ESTIMATES = ("sparse-data-bias", "limits-disagree")
"""Codes of findings whose numbers follow from the estimate of the coefficient that they name."""


def gives_all_away(model: ModelResult, m: int, hiding: Hiding) -> bool:
    """Whether a model's answers are its counts in another form, and some of these are hidden.

    A model with as many parameters as covariate patterns repeats the observed shares; one whose number of events is
    hidden would tell it by its log-likelihoods.
    """
    tables = {place[1] for place in hiding.places if place[0] == "cell"}
    hidden = any(("model", m, t) in tables for t, table in enumerate(model.tables) if not table.aside)
    saturated = model.patterns is not None and model.patterns <= model.parameters
    return hiding.hides("events", m) or (saturated and hidden)


def hidden_crude(model: ModelResult, m: int, hiding: Hiding) -> frozenset[int]:
    """The coefficients whose crude estimate, with the counts by level, would give a hidden count away."""
    found: set[int] = set()
    for t, table in enumerate(model.tables):
        if table.aside:
            continue
        blocks = row_blocks(table)
        hidden = {
            blocks[r]
            for r in range(len(table.rows))
            if any(hiding.hides("cell", ("model", m, t), r, k) for k in range(len(table.columns)))
        }
        words = {row_text(table, row) for block, row in zip(blocks, table.rows, strict=True) if block in hidden}
        for c, coefficient in enumerate(model.coefficients):
            if any(text and coefficient.label.startswith(text) for text in words):
                found.add(c)
    return frozenset(found)


def hidden_averages(model: ModelResult, m: int, hiding: Hiding) -> frozenset[int]:
    """As `hidden_crude`, of the levels compared with their average."""
    return hidden_crude(replace(model, coefficients=model.averages), m, hiding)


def crude_numbers(crude: CrudeEstimate | None) -> Iterator[float]:
    """The numbers of a crude estimate."""
    if crude is not None:
        limits = [limit for one in (crude.wald, crude.profile) if one is not None for limit in (one.lower, one.upper)]
        yield from (value for value in (crude.odds_ratio, *limits) if value is not None and value != 0.0)


def estimate_numbers(one: CoefficientResult) -> Iterator[float]:
    """The numbers of an estimate on the odds-ratio scale."""
    limits = [one.wald.lower, one.wald.upper, one.profile.lower, one.profile.upper]
    if one.exact is not None:
        exact = one.exact
        limits += [exact.lower, exact.upper, exact.mid_p_lower, exact.mid_p_upper, exact.median_unbiased]
    yield from (value for value in (one.odds_ratio, *limits) if value is not None and value != 0.0)


def finding_numbers(model: ModelResult, labels: Container[str]) -> Iterator[float]:
    """The numbers that findings tell of estimates with one of these labels."""
    for one in model.findings:
        if one.code in TELL_ESTIMATES and one.facts.get("label") in labels:
            yield from (value for value in one.facts.values() if isinstance(value, float))


def disclosed_model(model: ModelResult, m: int, hiding: Hiding) -> ModelResult:
    """The model with hidden counts, and the estimates that would give them away, as None with a reason."""
    flow = disclosed_flow(model.flow, m, hiding)
    records, events = hiding.count(model.records, "records", m), hiding.count(model.events, "events", m)
    reasons = dict(model.reasons)
    for name, before, after in (("records", model.records, records), ("events", model.events, events)):
        if before is not None and after is None:
            reasons[name] = say("why-count-hidden", threshold=hiding.threshold)
    closed = gives_all_away(model, m, hiding)
    if closed:
        hiding.taken += 2
        told = "why-likelihood-hidden" if hiding.hides("events", m) else "why-estimate-hidden"
        reasons |= dict.fromkeys(("log_likelihood", "null_log_likelihood"), say(told))
        reasons["checks"] = say("why-check-hidden")
    crude = hidden_crude(model, m, hiding)
    text = hiding.withheld.text
    return replace(
        model,
        flow=flow,
        records=records,
        events=events,
        log_likelihood=None if closed else model.log_likelihood,
        null_log_likelihood=None if closed else model.null_log_likelihood,
        coefficients=tuple(
            _coefficient(one, m, c, hiding, closed, c in crude) for c, one in enumerate(model.coefficients)
        ),
        terms=tuple(_term(one, hiding, closed) for one in model.terms),
        checks=() if closed else tuple(_check(model, one, m, c, hiding, flow) for c, one in enumerate(model.checks)),
        findings=tuple(disclosed_finding(one, hiding.withheld) for one in model.findings),
        tables=tuple(
            disclosed_table(table, ("model", m, t), hiding)
            for t, table in enumerate(model.tables)
            if not (closed and table.id.startswith(OF_ESTIMATES))
        ),
        figures=_figures(model, model.figures, hiding, flow),
        reasons={key: text(reason) for key, reason in reasons.items()},
        trends=tuple(_trend(one, hiding, closed) for one in model.trends),
        averages=tuple(
            _coefficient(one, m, c, hiding, closed, c in hidden_averages(model, m, hiding))
            for c, one in enumerate(model.averages)
        ),
    )


def _trend(one: TrendResult, hiding: Hiding, closed: bool) -> TrendResult:
    """A trend of a model whose answers are its counts in another form is told no more than these are."""
    if not closed:
        return one
    hiding.taken += 1
    reason = say("why-estimate-hidden")
    return replace(
        one,
        step=None,
        trend=_term(one.trend, hiding, closed),
        departure=_term(one.departure, hiding, closed),
        reason=reason,
    )


def _coefficient(
    one: CoefficientResult, m: int, c: int, hiding: Hiding, closed: bool, crude_hidden: bool
) -> CoefficientResult:
    estimates = hiding.withheld.estimates
    reason = say("why-estimate-hidden")
    reasons: dict[str, str] = dict(one.reasons)
    if closed or any(value in estimates for value in estimate_numbers(one)):
        hiding.taken += len(NUMBERS)
        reasons |= dict.fromkeys(NUMBERS, reason)
        one = replace(
            one,
            log_odds_ratio=None,
            standard_error=None,
            odds_ratio=None,
            wald=WaldResult(None, None, None, None),
            profile=ProfileResult(None, None),
            exact=None,
        )
    crude, everyone = one.crude, one.crude_all_records
    records = say("why-count-hidden", threshold=hiding.threshold)
    if crude is not None:
        if hiding.hides("records", m):
            crude = replace(crude, records=None)
            reasons["crude.records"] = records
        if closed or crude_hidden or any(value in estimates for value in crude_numbers(crude)):
            crude = CrudeEstimate(crude.records, None)
            reasons["crude"] = reason
            hiding.taken += 1
    if everyone is not None:
        count_hidden = hiding.hides("crude all", m, c)
        if count_hidden:
            everyone = replace(everyone, records=None)
            reasons["crude_all_records.records"] = records
        # With a handful of records more, the two crude estimates together tell who those records are.
        if count_hidden or "crude" in reasons or any(value in estimates for value in crude_numbers(everyone)):
            everyone = CrudeEstimate(everyone.records, None)
            reasons["crude_all_records"] = reason
            hiding.taken += 1
    text = hiding.withheld.text
    return replace(
        one,
        crude=crude,
        crude_all_records=everyone,
        reasons={key: text(words) for key, words in reasons.items()},
    )


def _term(term: TermTest, hiding: Hiding, closed: bool) -> TermTest:
    if not closed or (term.likelihood_ratio is None and term.p is None and term.wald is None):
        return term
    hiding.taken += 1
    return replace(term, likelihood_ratio=None, p=None, wald=None, reason=say("why-estimate-hidden"))


def _check(model: ModelResult, check: CheckResult, m: int, c: int, hiding: Hiding, flow: Flow) -> CheckResult:
    text = hiding.withheld.text
    statistics: dict[str, float | int | None] = {}
    reasons = {key: text(reason) for key, reason in check.reasons.items()}
    for name, value in check.statistics.items():
        hidden_count = ends_with(name, CELLS) and hiding.withheld.is_count(value)
        if hidden_count or (isinstance(value, float) and value in hiding.withheld.estimates):
            code = "why-count-hidden" if hidden_count else "why-estimate-hidden"
            statistics[name], reasons[name] = None, say(code, threshold=hiding.threshold)
            hiding.taken += 1
        else:
            statistics[name] = value
    return replace(
        check,
        title=text(check.title),
        line=text(check.line),
        statistics=statistics,
        reasons=reasons,
        findings=tuple(disclosed_finding(one, hiding.withheld) for one in check.findings),
        tables=tuple(disclosed_table(table, ("check", m, c, t), hiding) for t, table in enumerate(check.tables)),
        figures=_figures(
            model,
            tuple(figure for f, figure in enumerate(check.figures) if not _gives_away(m, c, f, hiding)),
            hiding,
            flow,
        ),
        explanation=check.explanation,
    )


def _gives_away(m: int, c: int, f: int, hiding: Hiding) -> bool:
    return any(place[:4] == ("figure", m, c, f) for place in hiding.places)


def _figures(model: ModelResult, figures: tuple[Figure, ...], hiding: Hiding, flow: Flow) -> tuple[Figure, ...]:
    made = (_figure(model, figure, hiding, flow) for figure in figures)
    return tuple(replace(one, alt=hiding.withheld.text(one.alt)) for one in made if one is not None)


def _figure(model: ModelResult, figure: Figure, hiding: Hiding, flow: Flow) -> Figure | None:
    match figure:
        case FlowFigure():
            return disclosed_flow_figure(figure, flow)
        case EstimatesFigure():
            return disclosed_estimates_figure(figure, hiding)
        case CalibrationFigure():
            return coarsen_calibration(figure, hiding.marks, model.level)
        case StepFigure():
            records, events = analysed_and_events(model)
            if records is None or events is None:
                return None
            return coarsen_steps(figure, hiding.marks, events, records - events)
        case PrecisionFigure():
            records, events = analysed_and_events(model)
            if records is None or events is None:
                return None
            return coarsen_precision(figure, hiding.marks, events, records - events)
        case CurveFigure():
            return coarsen_curve(figure, hiding.marks)
        case SpreadFigure():
            return disclosed_spread(figure, hiding.withheld.estimates)
        case ScatterFigure():
            return coarsen_scatter(figure, hiding.marks)
        case EnvelopeFigure():
            return coarsen_envelope(figure, hiding.marks)
        case HistogramFigure():
            made = coarsen_histogram(figure, hiding.marks)
            if made is None or _sizes(figure) & hiding.withheld.counts:
                return None
            hiding.taken += made[1]
            return made[0]


def _sizes(figure: HistogramFigure) -> set[int]:
    return {sum(count or 0 for count in counts) for _, counts in figure.series}


def disclosed_estimates_figure(figure: EstimatesFigure, hiding: Hiding) -> EstimatesFigure:
    """The figure without the estimates that are hidden elsewhere; its text alternative then tells what is drawn."""
    estimates = hiding.withheld.estimates
    marks = tuple(
        replace(mark, estimate=None, lower=None, upper=None, note=say("estimate-hidden-in-figure"))
        if any(value in estimates for value in (mark.estimate, mark.lower, mark.upper) if value is not None)
        else mark
        for mark in figure.marks
    )
    if marks == figure.marks:
        return figure
    told = [(mark.label, mark.series, mark.estimate, mark.lower, mark.upper) for mark in marks]
    hiding.taken += sum(before != after for before, after in zip(figure.marks, marks, strict=True))
    return replace(figure, marks=marks, alt=say("estimates-as-shown", marks=told))
