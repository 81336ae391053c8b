"""Tidy CSV tables: one row an observation, several models told apart by a column."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Sequence
from itertools import chain

from oddsmodel.findings import Finding
from oddsmodel.results.study import CoefficientResult, CrudeEstimate, DisclosedResults, ExactResult, ModelResult
from oddsmodel.results.tables import Cell, Hidden, Interval, Table

HIDDEN = "hidden"
_RUN = re.compile(r'((?:^|[;\t\r\n])[\s"]*)([=+\-@\uff0b\uff0d\uff1d\uff20])')
_CONTROL = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\x7f]")

Value = str | int | float | None
Row = Sequence[Value]


def csv_files(disclosed: DisclosedResults) -> dict[str, str]:
    """The tables of a study, by fixed file names (comma-separated, UTF-8, a header row, newline ends a line).

    A table that the study does not have is left out. A limit of an interval has a column of its own. A hidden value is
    an empty cell of a number column and the word "hidden" in the note column beside it.
    """
    study = disclosed.study
    found = {
        "estimates.csv": _csv(_ESTIMATES, chain.from_iterable(map(_estimates, study.models))),
        "terms.csv": _csv(_TERMS, _terms(study.models)),
        "flow.csv": _csv(("model", "step", "reason", "records", "note"), chain.from_iterable(map(_flow, study.models))),
        "checks.csv": _csv(
            ("model", "check", "verdict", "statistic", "value", "reason", "finding"),
            chain.from_iterable(map(_checks, study.models)),
        ),
        "findings.csv": _csv(("model", "severity", "code", "message"), _findings(disclosed)),
    }
    for name in ("levels", "lost"):
        tables = [(model.name, table) for model in study.models for table in model.tables if table.id == name]
        if tables:
            found[f"{name}.csv"] = _tables(tables, with_model=True)
    if study.characteristics is not None:
        found["characteristics.csv"] = _tables([("", study.characteristics)], with_model=False)
    if study.comparison is not None:
        found["comparison.csv"] = _tables([("", study.comparison)], with_model=False)
    derived = [table for one in study.derived for table in one.tables]
    if derived:
        found["derived.csv"] = _tables([("", table) for table in derived], with_model=False)
    return found


def neutral(text: str) -> str:
    """Text that no spreadsheet takes for a formula: an apostrophe stands before what would start one.

    Also after a semicolon, tab or line break within the text, which start a new cell where a file is opened with other
    separators. Control characters become spaces.
    """
    text = _RUN.sub(r"\1'\2", _CONTROL.sub(" ", text))
    return f"'{text}" if text.startswith(("\t", "\r", "\n")) else text


def _csv(header: Sequence[str], rows: Iterable[Row]) -> str:
    return "".join(",".join(map(_field, row)) + "\n" for row in chain([header], rows))


def _field(value: Value) -> str:
    """Text always in quotes, numbers never, so that a reader can tell "1" from 1; no number is not finite."""
    if value is None:
        return ""
    if isinstance(value, str):
        quoted = neutral(value).replace('"', '""')
        return f'"{quoted}"'
    if isinstance(value, bool):
        return "true" if value else "false"
    if not math.isfinite(value):
        raise ValueError("a number that is not finite must be None")
    return repr(int(value)) if isinstance(value, int) else repr(float(value))


_CRUDE = ("records", "odds_ratio", "wald_lower", "wald_upper", "profile_lower", "profile_upper")
_ESTIMATES = (
    *("model", "term", "level", "reference", "role", "label", "log_odds_ratio", "standard_error", "odds_ratio"),
    *("wald_lower", "wald_upper", "wald_p", "wald_df", "profile_lower", "profile_upper"),
    *(f"crude_{name}" for name in _CRUDE),
    *("crude_all_records", "crude_all_records_odds_ratio"),
    *("exact_lower", "exact_upper", "mid_p_lower", "mid_p_upper", "exact_p", "median_unbiased", "reasons"),
)


def _estimates(model: ModelResult) -> Iterable[Row]:
    for one in (*model.coefficients, *model.averages, *_steps(model)):
        everyone = one.crude_all_records
        numbers: Row = (
            one.odds_ratio,
            one.wald.lower,
            one.wald.upper,
            one.wald.p,
            one.wald.df,
            one.profile.lower,
            one.profile.upper,
        )
        if not one.shown and one.role != "intercept":
            numbers = (None, None, None, one.wald.p, one.wald.df, None, None)
        yield (
            model.name,
            one.term,
            one.level,
            one.reference,
            one.role,
            one.label,
            one.log_odds_ratio,
            one.standard_error,
            *numbers,
            *_crude(one.crude),
            everyone.records if everyone else None,
            everyone.odds_ratio if everyone else None,
            *_exact(one.exact),
            _reasons(one),
        )


def _exact(one: ExactResult | None) -> Row:
    if one is None:
        return (None,) * 6
    return (one.lower, one.upper, one.mid_p_lower, one.mid_p_upper, one.p_doubled, one.median_unbiased)


def _steps(model: ModelResult) -> Iterable[CoefficientResult]:
    return (one.step for one in model.trends if one.step is not None)


def _crude(crude: CrudeEstimate | None) -> Row:
    if crude is None:
        return (None,) * len(_CRUDE)
    limits = [(one.lower, one.upper) if one is not None else (None, None) for one in (crude.wald, crude.profile)]
    return (crude.records, crude.odds_ratio, *chain.from_iterable(limits))


def _reasons(one: CoefficientResult) -> str | None:
    told: dict[str, list[str]] = {}
    for name, reason in one.reasons.items():
        told.setdefault(reason, []).append(name)
    return " ".join(f"{', '.join(names)}: {reason}" for reason, names in told.items()) or None


_TERMS = (
    *("model", "term", "df", "likelihood_ratio", "p"),
    *("wald_f", "wald_df_denominator", "wald_p", "reason"),
)


def _terms(models: Iterable[ModelResult]) -> Iterable[Row]:
    for model in models:
        for one in model.terms:
            wald = (None, None, None) if one.wald is None else (one.wald.f, one.wald.df_denominator, one.wald.p)
            yield model.name, one.term, one.df, one.likelihood_ratio, one.p, *wald, one.reason


def _flow(model: ModelResult) -> Iterable[Row]:
    flow = model.flow
    steps: list[tuple[str, str | None, int | None]] = [("read", None, flow.read)]
    steps += [("left out", one.reason, one.records) for one in flow.left_out]
    steps += [("analysed", None, flow.analysed), ("events", None, flow.events)]
    for step, reason, records in steps:
        yield model.name, step, reason, records, HIDDEN if records is None else None


def _checks(model: ModelResult) -> Iterable[Row]:
    for check in model.checks:
        for name, value in (check.statistics or {"": None}).items():
            yield model.name, check.name, check.verdict, name or None, value, check.reasons.get(name), check.line


def _findings(disclosed: DisclosedResults) -> Iterable[Row]:
    def rows(model: str | None, findings: Iterable[Finding]) -> Iterable[Row]:
        return ((model, one.severity, one.code, one.message) for one in findings)

    yield from rows(None, disclosed.study.findings)
    for model in disclosed.study.models:
        of_checks = chain.from_iterable(check.findings for check in model.checks)
        yield from rows(model.name, chain(model.findings, (one for one in of_checks if one not in model.findings)))


def _tables(tables: Sequence[tuple[str, Table]], *, with_model: bool) -> str:
    """Tables of the same kind, one below the other; a column that only some have is empty for the others."""
    intervals = {
        column.key
        for _, table in tables
        for k, column in enumerate(table.columns)
        if column.kind == "interval" or any(isinstance(row[k], Interval) for row in table.rows)
    }
    keys = list(dict.fromkeys(column.key for _, table in tables for column in table.columns))
    # A group's column is named by the group, whose number says nothing.
    groups = {c.key: c.heading for _, table in tables for c in table.columns if c.key.startswith("group_")}
    names = chain.from_iterable(
        (f"{key}_lower", f"{key}_upper") if key in intervals else (groups.get(key, key),) for key in keys
    )
    header = (*(("model",) if with_model else ()), *names, "note")
    rows: list[Row] = []
    for model, table in tables:
        position = {column.key: k for k, column in enumerate(table.columns)}
        for row in table.rows:
            cells = {key: row[position[key]] if key in position else None for key in keys}
            values = chain.from_iterable(_values(cell, key in intervals) for key, cell in cells.items())
            hidden = [key for key, cell in cells.items() if isinstance(cell, Hidden)]
            note = f"{HIDDEN}: {', '.join(hidden)}" if hidden else None
            rows.append((*((model,) if with_model else ()), *values, note))
    return _csv(header, rows)


def _values(cell: Cell, interval: bool) -> Row:
    if isinstance(cell, Hidden):
        return (None, None) if interval else (None,)
    if isinstance(cell, Interval):
        return cell.lower, cell.upper
    return (cell, None) if interval else (cell,)
