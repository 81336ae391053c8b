"""Every coefficient of a fitted model on the odds-ratio scale, with its intervals, its crude estimates and reasons."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from oddsmodel.design.types import DesignColumn
from oddsmodel.inference.profile import ProfileLimits
from oddsmodel.measures.crude import Crude
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.measures.scale import exponential, limits_on_ratio_scale
from oddsmodel.measures.wald import wald
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.study import CoefficientResult, ProfileResult, WaldResult
from oddsmodel.wording import say


def coefficients(
    model: FittedModel, limits: ProfileLimits | None, crude: Mapping[int, Crude] | None = None
) -> tuple[CoefficientResult, ...]:
    """The coefficients of the model in the order of its matrix, all per the plan's unit (`per`).

    limits: profile limits of every coefficient for one unit of its column, at the model's level, on the log-odds scale;
    None where the records are grouped, so that there is no likelihood: the Wald limits then rest on the cluster-robust
    standard error and on Student's distribution with one degree of freedom fewer than groups.
    crude: crude estimates by position.

    log_odds_ratio and standard_error are multiplied by `per` as well, so that the odds ratio is always the exponential
    of the log odds ratio. A column of a spline, another function or an interaction keeps these two and has no odds
    ratio of its own; nor has the intercept of a case-control study, where it only tells how many controls were taken.
    """
    crude = crude or {}
    return tuple(
        _coefficient(model, position, column, limits, crude.get(position))
        for position, column in enumerate(model.design.columns)
    )


def _coefficient(
    model: FittedModel, position: int, column: DesignColumn, limits: ProfileLimits | None, crude: Crude | None
) -> CoefficientResult:
    estimate = float(model.fit.coefficients[position]) * column.per
    contrast = np.zeros(model.fit.coefficients.size)
    contrast[position] = column.per
    standard_error, df = standard_error_of(model, contrast)
    reasons = dict(crude.reasons) if crude else {}
    odds_ratio = None
    wald_limits, profile_limits = WaldResult(None, None, None), ProfileResult(None, None)

    withheld = _no_odds_ratio(model, column, estimate)
    if withheld is not None:
        reasons |= dict.fromkeys(("odds_ratio", "wald", "profile"), withheld)
    else:
        odds_ratio = exponential(estimate)
        wald_limits = wald_result(estimate, standard_error, model.level, reasons, df)
        if limits is None:
            reasons["profile"] = say("no-likelihood-of-grouped-records")
        else:
            profile_limits = profile_result(limits, position, column.per, reasons)
    if standard_error is None:
        reasons["standard_error"] = say("no-standard-error-of-one-group")
    return CoefficientResult(
        term=column.term,
        level=column.level,
        reference=column.reference,
        levels=column.levels,
        role=column.role,
        label=column.label,
        log_odds_ratio=estimate,
        standard_error=standard_error,
        odds_ratio=odds_ratio,
        wald=wald_limits,
        profile=profile_limits,
        shown=column.shown,
        crude=crude.same if crude else None,
        crude_all_records=crude.all_records if crude else None,
        reasons=reasons,
    )


def _no_odds_ratio(model: FittedModel, column: DesignColumn, estimate: float) -> str | None:
    """Why the coefficient has no odds ratio of its own, or None where it has one."""
    if column.kind == "intercept":
        return say("intercept-of-case-control") if model.study_design in CASE_CONTROL else None
    if not column.shown:
        return say("column-without-own-odds-ratio", term=column.term)
    return say("odds-ratio-out-of-range") if exponential(estimate) is None else None


def standard_error_of(model: FittedModel, contrast: Array) -> tuple[float | None, int | None]:
    """The standard error of contrast'β, contrast (p,), and the degrees of freedom of its t; None for both where normal.

    Where records are grouped it allows for that, and is None where one group alone tells of the contrast.
    """
    if model.grouping is not None:
        return model.grouping.standard_error(contrast), model.grouping.df
    return float(np.sqrt(max(0.0, float(contrast @ model.fit.covariance @ contrast)))), None


def wald_result(
    estimate: float, standard_error: float | None, level: float, reasons: dict[str, str], df: int | None = None
) -> WaldResult:
    """Wald limits on the odds-ratio scale of an estimate on the log-odds scale; what is missing gets a reason."""
    if standard_error is None:
        reasons["wald"] = say("no-wald-of-one-group")
        return WaldResult(None, None, None, df)
    # No curvature in this direction: the quadratic approximation says nothing.
    if standard_error <= 0.0:
        reasons["wald"] = say("no-standard-error")
        return WaldResult(None, None, None)
    ends = wald(estimate, standard_error, level, df)
    lower, upper = exponential(ends.lower), exponential(ends.upper)
    for name, limit in (("lower", lower), ("upper", upper)):
        if limit is None:
            reasons[f"wald.{name}"] = say("limit-out-of-range")
    return WaldResult(lower, upper, ends.p, df)


def profile_result(limits: ProfileLimits, position: int, per: float, reasons: dict[str, str]) -> ProfileResult:
    """The profile limits number `position` for `per` units, as odds ratios; what is missing gets a reason."""
    scaled = _per(limits, position, per)
    interval = limits_on_ratio_scale(scaled, 0)
    for name, limit, status in (
        ("lower", interval.lower, scaled.lower_status[0]),
        ("upper", interval.upper, scaled.upper_status[0]),
    ):
        if limit is None:
            reasons[f"profile.{name}"] = {
                "found": say("limit-out-of-range"),
                "no finite limit": say(f"no-finite-{name}-limit"),
                "not found": say("limit-not-found"),
            }[status]
    return ProfileResult(interval.lower, interval.upper)


def _per(limits: ProfileLimits, position: int, per: float) -> ProfileLimits:
    """The limits of one coefficient for `per` units of its column; a negative `per` turns them round."""
    one = slice(position, position + 1)
    lower, upper = limits.lower[one] * per, limits.upper[one] * per
    lower_status, upper_status = tuple(limits.lower_status[one]), tuple(limits.upper_status[one])
    if per < 0.0:
        return ProfileLimits(upper, lower, upper_status, lower_status)
    return ProfileLimits(lower, upper, lower_status, upper_status)
