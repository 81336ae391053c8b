"""Crude estimates: each exposure alone, on the records of the model and on all records that have its column."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.types import DesignColumn
from oddsmodel.errors import InputFault
from oddsmodel.inference.clustered import clustered_covariance, small_sample_factor, within_one_group
from oddsmodel.inference.maximise import Fit, maximise
from oddsmodel.inference.profile import profile
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.measures.counts import design_levels, level_codes, level_columns
from oddsmodel.measures.scale import exponential, limits_on_ratio_scale
from oddsmodel.measures.wald import wald
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.grouped import group_codes
from oddsmodel.model.kept import KeptRecords, People
from oddsmodel.results.study import CrudeEstimate, ProfileResult, WaldResult
from oddsmodel.wording import say

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Crude:
    """same: on the model's own records. all_records: on all that have the column, where those are more.

    What is not given is None, with its reason under "crude" or "crude_all_records".
    """

    same: CrudeEstimate | None
    all_records: CrudeEstimate | None = None
    reasons: Mapping[str, str] = field(default_factory=dict)


def crude(model: FittedModel, kept: People | None = None) -> dict[int, Crude]:
    """The crude estimates of every exposure coefficient, by its position in the model matrix.

    A crude estimate comes from a logistic model of the one exposure and an intercept. With an exposure in levels
    that model is saturated: the likelihood of one level against the reference is free of the other levels, so
    estimate and profile limits come from the 2×2 table of the two, whatever happens at the other levels. With a
    number or a function of one, equal values are taken together. An exposure that takes several columns other than
    levels, or enters with an interaction, has no crude odds ratio of a single coefficient, and none is given; nor
    where the model has no intercept.

    kept: all kept records with the outcome. The second estimate is given only where the number of records differs.
    """
    answers: dict[int, Crude] = {}
    intercept = any(column.kind == "intercept" for column in model.design.columns)
    plain = set(plain_exposures(model))
    for position in model.exposure_indices:
        column = model.design.columns[position]
        if not intercept:
            answers[position] = Crude(None, reasons={"crude": say("crude-without-intercept")})
        elif column.sources[0] not in plain or not column.shown:
            answers[position] = Crude(None, reasons={"crude": say("crude-of-several-columns", term=column.term)})
        else:
            answers[position] = _both(model, position, kept)
    return answers


def plain_exposures(model: FittedModel) -> tuple[str, ...]:
    """The exposures that enter the model only as levels against a reference or as one column of numbers."""
    plain = []
    for name in model.exposures:
        columns = [column for column in model.design.columns if name in column.sources]
        if columns and all(column.shown and column.sources == (name,) for column in columns):
            plain.append(name)
    return tuple(plain)


def _both(model: FittedModel, position: int, kept: People | None) -> Crude:
    column = model.design.columns[position]
    reasons: dict[str, str] = {}
    same = _estimate(model, position, _values(model, column, model.people.of(column.sources[0])), "crude", reasons)
    if kept is None:
        return Crude(same, None, reasons)
    everyone = _values(model, column, kept.of(column.sources[0]))
    if everyone.records == same.records:
        reasons["crude_all_records"] = say("crude-same-records")
        return Crude(same, None, reasons)
    return Crude(same, _estimate(model, position, everyone, "crude_all_records", reasons), reasons)


@dataclass(frozen=True, slots=True)
class _Values:
    """The distinct values (m) of an exposure as a column of its own kind, with their events (m,) and trials (m,).

    index (n,): the value of each record, −1 where it has none of them. source: the n records.
    """

    distinct: pd.Series
    events: Array
    trials: Array
    index: NDArray[np.intp]
    source: KeptRecords

    @property
    def records(self) -> int:
        return round(float(self.trials.sum()))


def _estimate(model: FittedModel, position: int, values: _Values, key: str, reasons: dict[str, str]) -> CrudeEstimate:
    """The crude estimate on some records; where there is none, the reason goes under `key`."""
    column = model.design.columns[position]
    withheld = CrudeEstimate(records=values.records, odds_ratio=None)
    try:
        X, events, trials, place = _table(model, position, values)
    except InputFault:
        reasons[key] = say("crude-beyond-the-model", term=column.term)
        return withheld

    # A group of nobody, or a single value: the exposure's column is constant.
    if np.unique(X[trials > 0, 1]).size < 2:
        reasons[key] = say("crude-no-contrast")
        return withheld
    fit = maximise(BinomialLikelihood(X, events, trials=trials))
    if fit.status != "converged":
        code = "crude-no-finite-maximum" if fit.status == "no finite maximum" else "crude-not-estimated"
        reasons[key] = say(code)
        return withheld

    estimate = float(fit.coefficients[1]) * column.per
    odds_ratio = exponential(estimate)
    if odds_ratio is None:
        reasons[key] = say("odds-ratio-out-of-range")
        return withheld
    if model.grouping is not None:
        return _of_groups(model, position, values, fit, place, key, reasons)
    standard_error = float(fit.standard_errors[1]) * abs(column.per)
    ends = wald(estimate, standard_error, model.level)
    interval = limits_on_ratio_scale(profile(fit, np.array([[0.0, column.per]]), model.level), 0)
    return CrudeEstimate(
        records=values.records,
        odds_ratio=odds_ratio,
        wald=WaldResult(exponential(ends.lower), exponential(ends.upper), ends.p),
        profile=ProfileResult(interval.lower, interval.upper),
    )


def _values(model: FittedModel, column: DesignColumn, records: KeptRecords) -> _Values:
    """Equal values of the exposure taken together; where the model has it in levels, only those that it knows."""
    name = column.sources[0]
    codes, distinct = pd.factorize(records.frame[name])
    series = pd.Series(distinct, name=name)
    known: NDArray[np.bool_] = codes >= 0
    if column.kind == "level":
        seen = level_codes(series, design_levels(model, name)) >= 0
        # None is seen where the levels are bands of a number, which hold values that were not.
        known &= seen[codes] | (not seen.any())
    weight = np.ones(int(known.sum())) if records.counts is None else records.counts[known]
    trials = np.bincount(codes[known], weights=weight, minlength=len(series)).astype(np.float64)
    events = np.bincount(codes[known], weights=weight * records.event[known], minlength=len(series)).astype(np.float64)
    there = trials > 0
    index = np.where(known, (np.cumsum(there) - 1)[codes], -1)
    return _Values(series[there].reset_index(drop=True), events[there], trials[there], index, records)


def _of_groups(
    model: FittedModel,
    position: int,
    values: _Values,
    fit: Fit,
    place: NDArray[np.intp],
    key: str,
    reasons: dict[str, str],
) -> CrudeEstimate:
    """The crude estimate with Wald limits that allow for groups, those of the model of all levels of the exposure."""
    column, grouping = model.design.columns[position], model.grouping
    assert grouping is not None
    source, known = values.source, values.index >= 0
    codes, _ = group_codes(source.frame[grouping.column])
    number = np.unique(codes[known]).size
    own = len(level_columns(model, column.sources[0])) if column.kind == "level" else 1
    factor = small_sample_factor(number, values.records, own + 1)

    row = np.where(known, place[values.index], -1)
    there = row >= 0
    estimate = float(fit.coefficients[1]) * column.per
    alone = column.kind == "level" and within_one_group(row[there] == 1, codes[there])
    # Of the estimate on all records neither interval is told.
    if key == "crude":
        reasons["crude.profile"] = say("no-likelihood-of-grouped-records")
    if factor is None or alone:
        if key == "crude":
            reasons["crude.wald"] = say("no-wald-of-one-group")
        return CrudeEstimate(values.records, exponential(estimate))
    counts = None if source.counts is None else source.counts[there]
    covariance = clustered_covariance(fit, row[there], source.event[there], codes[there], factor, counts)
    standard_error = float(np.sqrt(covariance[1, 1])) * abs(column.per)
    ends = wald(estimate, standard_error, model.level, number - 1)
    limits = WaldResult(exponential(ends.lower), exponential(ends.upper), ends.p, number - 1)
    return CrudeEstimate(values.records, exponential(estimate), limits)


def _table(model: FittedModel, position: int, values: _Values) -> tuple[Array, Array, Array, NDArray[np.intp]]:
    """Matrix (m, 2), events (m,), trials (m,) of an intercept and the exposure's column, and the row of each value.

    For a level m = 2: the reference and the level, and other levels have the row −1. InputFault where the model's
    function has no value.
    """
    column = model.design.columns[position]
    name = column.sources[0]
    if column.kind == "number":
        x = values.distinct.to_numpy(dtype=np.float64)
        return np.column_stack([np.ones(x.size), x]), values.events, values.trials, np.arange(x.size)
    # Only the exposure's own columns are read: the others hold any values that the model knows.
    one = model.rows.columns_at(np.zeros(1, dtype=np.int64))
    frame = one.iloc[np.zeros(len(values.distinct), dtype=int)].reset_index(drop=True)
    frame[name] = values.distinct
    X = model.design.encode(frame)
    if column.kind == "transform":
        matrix = np.column_stack([np.ones(len(frame)), X[:, position]])
        return matrix, values.events, values.trials, np.arange(len(frame))
    own = level_columns(model, name)
    groups = np.array([~X[:, own].any(axis=1), X[:, position] == 1.0], dtype=np.float64)
    place = np.where(groups[0] > 0, 0, np.where(groups[1] > 0, 1, -1))
    return np.array([[1.0, 0.0], [1.0, 1.0]]), groups @ values.events, groups @ values.trials, place
