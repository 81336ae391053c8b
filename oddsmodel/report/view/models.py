"""The estimates of each model, and the models side by side."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from oddsmodel.findings import Finding
from oddsmodel.report.view.checks import ChecksView, checks
from oddsmodel.report.view.counted import ABOUT_ADJUSTMENT
from oddsmodel.report.view.sheet import FigureView, Sheets
from oddsmodel.report.view.tables import TableView
from oddsmodel.results.figures import EstimatesFigure, FlowFigure
from oddsmodel.results.lead import EXACT, SEPARATED, exposures_shown, has_profile, is_estimated, is_told
from oddsmodel.results.study import ModelResult, Role, StudyResults
from oddsmodel.results.tables import Cell, Interval, Table, TableColumn
from oddsmodel.wording import numbers, say
from oddsmodel.wording.study_methods import METHOD_WORDS

CRUDE_TABLES = ("levels", "crude_to_adjusted")


@dataclass(frozen=True, slots=True)
class EstimatesView:
    """The exposures' table up front; adjustment columns and whole-term tests folded."""

    exposures: TableView | None
    lead_interval: str
    adjustment: TableView | None
    terms: TableView | None
    further: tuple[TableView, ...]
    figures: tuple[FigureView, ...]
    reasons: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class CrudeView:
    heading: str
    by_level: TableView | None
    change: TableView | None
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class OtherModelView:
    """A model beside the one that answers, or one that could not be estimated, or in part (`estimates` None where none
    of it could). method: in words, where the models of the study differ in it."""

    id: str
    name: str
    differs: str
    why: str
    added: str
    formula: str
    method: str
    heading: str
    estimates: EstimatesView | None
    picture: FigureView | None
    checks: ChecksView | None
    findings: tuple[Finding, ...]
    status: str


@dataclass(frozen=True, slots=True)
class ComparisonView:
    table: TableView | None
    figure: FigureView | None


def crude(model: ModelResult, sheets: Sheets) -> CrudeView:
    by_id = {table.id: table for table in model.tables}
    levels, change = (by_id.get(name) for name in CRUDE_TABLES)
    notes = tuple(one.message for one in model.findings if one.code in ABOUT_ADJUSTMENT)
    return CrudeView(
        heading="heading-crude-adjusted" if model.adjustment else "heading-by-exposure",
        by_level=sheets.table(levels) if levels is not None else None,
        change=sheets.table(change) if change is not None else None,
        notes=notes or ((say("same-records-caution"),) if model.adjustment else ()),
    )


def estimates(model: ModelResult, sheets: Sheets) -> EstimatesView:
    exposures = exposures_table(model)
    adjustment = None if model.method == EXACT else _coefficients(model, "adjustment")
    figures = [one for one in model.figures if not isinstance(one, EstimatesFigure | FlowFigure)]
    # In the order of the page, which gives figures and tables their numbers.
    return EstimatesView(
        exposures=sheets.table(exposures) if exposures is not None else None,
        lead_interval=say(_lead(model)),
        figures=sheets.figures(figures),
        further=sheets.tables(table for table in model.tables if table.id not in CRUDE_TABLES),
        adjustment=sheets.table(adjustment) if adjustment is not None else None,
        terms=sheets.table(_terms(model)) if model.terms else None,
        reasons=tuple(
            dict.fromkeys(
                say("no-value-reason", label=one.label, reason=reason)
                for one in exposures_shown(model)
                for key, reason in one.reasons.items()
                if not key.startswith("crude") and key not in _told_once(model)
            )
        ),
    )


def _told_once(model: ModelResult) -> tuple[str, ...]:
    """Parts of an estimate that this kind of model has none of, as the line on intervals says once for all."""
    if model.method == EXACT:
        return ("standard_error", "wald", "profile")
    return ("profile",) if model.groups is not None else ()


def _lead(model: ModelResult) -> str:
    if model.groups is not None:
        return "lead-grouped"
    if model.method == EXACT:
        return "lead-exact"
    if model.status == SEPARATED:
        return "lead-separated"
    if model.method in ("penalised", "log-F"):
        return f"lead-{model.method.lower()}"
    return "lead-profile" if has_profile(model) else "lead-wald"


def exposures_table(model: ModelResult) -> Table | None:
    """The exposure's odds ratios with their intervals and p-values; None where none has an odds ratio of its own."""
    if model.method == EXACT:
        return _exact(model)
    return _coefficients(model, "exposure")


def _coefficients(model: ModelResult, role: Role) -> Table | None:
    of_role = [one for one in model.coefficients if one.role == role]
    shown = exposures_shown(model) if role == "exposure" else tuple(one for one in of_role if one.shown)
    if not any(one.shown for one in of_role):
        return None
    percent = say("level", level=model.level)
    profile = has_profile(model)
    columns = [
        TableColumn("label", say(f"column-{role}")),
        TableColumn("odds_ratio", say("column-odds-ratio"), "odds_ratio"),
        *([TableColumn("profile", say("column-profile", level=percent), "interval")] if profile else []),
        TableColumn("wald", say("column-wald", level=percent), "interval"),
        TableColumn("p", say("column-p"), "p"),
    ]
    rows: list[tuple[Cell, ...]] = []
    for one in shown:
        intervals: list[Cell] = [Interval(one.profile.lower, one.profile.upper)] if profile else []
        intervals.append(Interval(one.wald.lower, one.wald.upper))
        if one.odds_ratio is None:
            intervals = [_one_sided(interval) for interval in intervals]
        rows.append((one.label, one.odds_ratio, *intervals, one.wald.p))
    together = list(dict.fromkeys(one.term for one in of_role if not one.shown))
    note = say("columns-not-shown", terms=numbers.listed(together)) if together else ""
    adjusted = bool(model.adjustment) or len(model.exposures) > 1
    title = f"table-{role}" if role == "adjustment" or adjusted else "table-exposure-unadjusted"
    return Table(role, say(title), tuple(columns), tuple(rows), note)


def _one_sided(cell: Cell) -> Cell:
    """A limit on one side stands without an estimate; where there is neither limit the cell is empty."""
    return cell if isinstance(cell, Interval) and (cell.lower, cell.upper) != (None, None) else None


def _exact(model: ModelResult) -> Table | None:
    """The exposure's coefficients by exact conditional inference."""
    shown = [one for one in exposures_shown(model) if one.exact is not None]
    if not shown:
        return None
    percent = say("level", level=model.level)
    columns = (
        TableColumn("label", say("column-exposure")),
        TableColumn("odds_ratio", say("column-conditional"), "odds_ratio"),
        TableColumn("exact", say("column-exact", level=percent), "interval"),
        TableColumn("mid_p", say("column-mid-p", level=percent), "interval"),
        TableColumn("median_unbiased", say("column-median-unbiased"), "odds_ratio"),
        TableColumn("p", say("column-exact-p"), "p"),
        TableColumn("p_mid", say("column-mid-p-p"), "p"),
    )
    rows: list[tuple[Cell, ...]] = []
    for one in shown:
        exact = one.exact
        assert exact is not None
        rows.append(
            (
                one.label,
                one.odds_ratio,
                _one_sided(Interval(exact.lower, exact.upper)),
                _one_sided(Interval(exact.mid_p_lower, exact.mid_p_upper)),
                exact.median_unbiased,
                exact.p_doubled,
                exact.p_mid,
            )
        )
    return Table("exposure", say("table-exposure-exact"), columns, tuple(rows), say("exact-note"))


def _terms(model: ModelResult) -> Table:
    if model.groups is not None:
        return _terms_of_groups(model)
    columns = (
        TableColumn("term", say("column-term")),
        TableColumn("df", say("column-df"), "count"),
        TableColumn("likelihood_ratio", say("column-likelihood-ratio"), "number"),
        TableColumn("p", say("column-term-p"), "p"),
    )
    rows: list[tuple[Cell, ...]] = []
    reasons: dict[str, None] = {}
    for term in model.terms:
        name = say(term.term) if term.term in ("all exposure columns", "whole model") else term.term
        rows.append((name, term.df, term.likelihood_ratio, term.p))
        if term.reason:
            reasons[say("no-value-reason", label=name, reason=term.reason)] = None
    return Table("terms", say("terms-table"), columns, tuple(rows), " ".join([say("terms-note"), *reasons]))


def _terms_of_groups(model: ModelResult) -> Table:
    columns = (
        TableColumn("term", say("column-term")),
        TableColumn("df", say("column-df"), "count"),
        TableColumn("f", say("column-wald-f"), "number"),
        TableColumn("df_denominator", say("column-df-denominator"), "count"),
        TableColumn("p", say("column-p"), "p"),
    )
    rows: list[tuple[Cell, ...]] = []
    reasons: dict[str, None] = {}
    for term in model.terms:
        name = say(term.term) if term.term in ("all exposure columns", "whole model") else term.term
        wald = term.wald
        rows.append((name, term.df, *((wald.f, wald.df_denominator, wald.p) if wald else (None, None, None))))
        if wald is None and term.reason:
            reasons[say("no-value-reason", label=name, reason=term.reason)] = None
    note = " ".join([say("terms-note-grouped"), *reasons])
    return Table("terms", say("terms-table-grouped"), columns, tuple(rows), note)


def other_models(study: StudyResults, lead: ModelResult | None, sheets: Sheets) -> tuple[OtherModelView, ...]:
    """The estimated models beside the one that answers."""
    return tuple(
        _other(study, model, place, sheets)
        for place, model in enumerate(study.models)
        if model is not lead and is_estimated(model)
    )


def not_estimated(study: StudyResults, lead: ModelResult | None, sheets: Sheets) -> tuple[OtherModelView, ...]:
    """The models that could not be estimated, in words, but for the one that answers where it is told of in full."""
    return tuple(
        _other(study, model, place, sheets)
        for place, model in enumerate(study.models)
        if not is_estimated(model) and not (model is lead and is_told(model))
    )


def method_beside(study: StudyResults, model: ModelResult) -> str:
    """A model's method in words, where the models of the study are not all by maximum likelihood."""
    if all(one.method == "maximum likelihood" for one in study.models):
        return ""
    return say("by-method", method=METHOD_WORDS[model.method])


def _other(study: StudyResults, model: ModelResult, place: int, sheets: Sheets) -> OtherModelView:
    estimated, told = is_estimated(model), is_told(model)
    picture = next((figure for figure in model.figures if isinstance(figure, EstimatesFigure)), None)
    return OtherModelView(
        id=f"model-{place + 1}",
        name=model.name,
        differs=" ".join(_what_differs(model)),
        why=say("model-why", why=model.why) if model.why else "",
        added=say("added-by-program") if model.added_by_program else "",
        formula=model.formula,
        method=method_beside(study, model),
        heading="heading-partly-estimated" if told else "heading-not-estimated",
        picture=sheets.figure(picture) if told and picture is not None and picture.marks else None,
        estimates=estimates(model, sheets) if told else None,
        checks=checks(model, sheets) if estimated else None,
        findings=model.findings,
        status=say("partly-estimated" if told else "not-estimated", status=model.status),
    )


def _what_differs(model: ModelResult) -> Iterator[str]:
    if model.role in ("sensitivity", "subgroup") or model.planned is not None:
        yield say("model-role-said", role=model.role, planned=model.planned)
    if model.differs:
        yield f"{model.differs}."
    yield say("model-differs", adjustment=list(model.adjustment_labels), records=model.records, events=model.events)


def comparison(study: StudyResults, sheets: Sheets) -> ComparisonView | None:
    if study.comparison is None and study.comparison_figure is None:
        return None
    return ComparisonView(
        figure=sheets.figure(study.comparison_figure) if study.comparison_figure is not None else None,
        table=sheets.table(study.comparison) if study.comparison is not None else None,
    )
