"""Crude estimates: each exposure alone, on the records of the model and on all records that have its column."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.types import DesignColumn
from oddsmodel.inference.maximise import maximise
from oddsmodel.inference.profile import profile
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.measures.counts import level_counts, model_levels, whole
from oddsmodel.measures.scale import exponential, limits_on_ratio_scale
from oddsmodel.measures.wald import wald
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CrudeEstimate, ProfileResult, WaldResult
from oddsmodel.wording import say

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class KeptRecords:
    """Records that belong to the study and have the outcome, whether or not the other columns are recorded.

    frame: coded columns (n rows); event (n,): whether the event happened; counts (n,): true frequencies, or None.
    """

    frame: pd.DataFrame
    event: NDArray[np.bool_]
    counts: Array | None = None


@dataclass(frozen=True, slots=True)
class Crude:
    """same: on the model's own records. all_records: on all that have the column, where those are more.

    What is not given is None, with its reason under "crude" or "crude_all_records".
    """

    same: CrudeEstimate | None
    all_records: CrudeEstimate | None = None
    reasons: Mapping[str, str] = field(default_factory=dict)


def crude(model: FittedModel, kept: KeptRecords | None = None) -> dict[int, Crude]:
    """The crude estimates of every exposure coefficient, by its position in the model matrix.

    A crude estimate comes from a logistic model of the one exposure and an intercept. With an exposure in levels
    that model is saturated: the likelihood of one level against the reference is free of the other levels, so
    estimate and profile limits come from the 2×2 table of the two, whatever happens at the other levels. With a
    number, equal values are taken together. An exposure that enters as a spline, another function, or with an
    interaction has no crude odds ratio of a single coefficient, and none is given; nor where the model has no
    intercept.

    kept: all kept records with the outcome. The second estimate is given only where the number of records differs.
    """
    answers: dict[int, Crude] = {}
    intercept = any(column.kind == "intercept" for column in model.design.columns)
    plain = set(plain_exposures(model))
    own = KeptRecords(model.frame, model.event, model.counts)
    for position in model.exposure_indices:
        column = model.design.columns[position]
        if not intercept:
            answers[position] = Crude(None, reasons={"crude": say("crude-without-intercept")})
        elif column.sources[0] not in plain or not column.shown:
            answers[position] = Crude(None, reasons={"crude": say("crude-of-several-columns", term=column.term)})
        else:
            answers[position] = _both(model, column, own, kept)
    return answers


def plain_exposures(model: FittedModel) -> tuple[str, ...]:
    """The exposures that enter the model only as levels against a reference or as a single number."""
    plain = []
    for name in model.exposures:
        columns = [column for column in model.design.columns if name in column.sources]
        if columns and all(column.shown and column.kind in ("level", "number") for column in columns):
            plain.append(name)
    return tuple(plain)


def _both(model: FittedModel, column: DesignColumn, own: KeptRecords, kept: KeptRecords | None) -> Crude:
    reasons: dict[str, str] = {}
    same = _estimate(model, column, own, "crude", reasons)
    if kept is None:
        return Crude(same, None, reasons)
    recorded = kept.frame[column.sources[0]].notna().to_numpy()
    number = int(recorded.sum()) if kept.counts is None else round(float(kept.counts[recorded].sum()))
    if number == same.records:
        reasons["crude_all_records"] = say("crude-same-records")
        return Crude(same, None, reasons)
    return Crude(same, _estimate(model, column, kept, "crude_all_records", reasons), reasons)


def _estimate(
    model: FittedModel, column: DesignColumn, records: KeptRecords, key: str, reasons: dict[str, str]
) -> CrudeEstimate:
    """The crude estimate on some records; where there is none, the reason goes under `key`."""
    if column.kind == "level":
        X, events, trials, number = _level_table(column, model_levels(model, column.sources[0]), records)
    else:
        X, events, trials = _number_table(column, records)
        number = int(whole(np.array([trials.sum()]))[0])
    withheld = CrudeEstimate(records=number, odds_ratio=None)

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
    standard_error = float(fit.standard_errors[1]) * abs(column.per)
    odds_ratio = exponential(estimate)
    if odds_ratio is None:
        reasons[key] = say("odds-ratio-out-of-range")
        return withheld
    ends = wald(estimate, standard_error, model.level)
    limits = profile(fit, np.array([[0.0, column.per]]), model.level)
    interval = limits_on_ratio_scale(limits, 0)
    return CrudeEstimate(
        records=number,
        odds_ratio=odds_ratio,
        wald=WaldResult(exponential(ends.lower), exponential(ends.upper), ends.p),
        profile=ProfileResult(interval.lower, interval.upper),
    )


def _level_table(
    column: DesignColumn, levels: tuple[str, ...], records: KeptRecords
) -> tuple[Array, Array, Array, int]:
    """Matrix (2, 2), events (2,), trials (2,) of the reference and the level; and the records at any level."""
    counted = level_counts(records.frame[column.sources[0]], records.event, records.counts, levels)
    pair = [counted.levels.index(str(column.reference)), counted.levels.index(str(column.level))]
    X = np.array([[1.0, 0.0], [1.0, 1.0]])
    return X, counted.events[pair].astype(float), counted.records[pair].astype(float), int(counted.records.sum())


def _number_table(column: DesignColumn, records: KeptRecords) -> tuple[Array, Array, Array]:
    """Matrix (m, 2), events (m,), trials (m,) with equal values of the number taken together."""
    values = records.frame[column.sources[0]].to_numpy(dtype=np.float64)
    recorded = np.isfinite(values)
    weight = np.ones(int(recorded.sum())) if records.counts is None else records.counts[recorded]
    distinct, place = np.unique(values[recorded], return_inverse=True)
    trials = np.bincount(place, weights=weight).astype(np.float64)
    events = np.bincount(place, weights=weight * records.event[recorded]).astype(np.float64)
    X = np.column_stack([np.ones(distinct.size), distinct])
    return X, events, trials
