"""What is told of a model whose records are separated: no number where there is none, and how far it reaches down."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from oddsmodel.design.types import DesignColumn
from oddsmodel.inference import OneSidedLimit, ProfileLimits, one_sided_limits, profile
from oddsmodel.measures.coefficients import profile_result, wald_result
from oddsmodel.measures.crude import Crude
from oddsmodel.measures.designs import CASE_CONTROL
from oddsmodel.measures.scale import exponential
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CoefficientResult, ProfileResult, WaldResult
from oddsmodel.study.fitting import Separated
from oddsmodel.wording import say
from oddsmodel.wording.numbers import ratio


def separated_coefficients(
    model: FittedModel, separated: Separated, crude: Mapping[int, Crude]
) -> tuple[CoefficientResult, ...]:
    """Every coefficient in the order of the matrix: finite ones from the records that are not separated, the others
    without an estimate but with the limit on the side where their profile likelihood has one."""
    verdict, part = separated.verdict, separated.part
    finite = [j for j, kind in enumerate(verdict.coefficients) if kind == "finite"]
    limits: ProfileLimits | None = None
    if part.fit is not None and part.fit.status == "converged" and finite:
        limits = profile(part.fit, part.within(np.eye(len(verdict.coefficients))[finite]), model.level)
    one_sided = one_sided_limits(model.binomial, verdict, part, level=model.level)
    found = []
    for position, column in enumerate(model.design.columns):
        of_its_own = crude.get(position)
        reasons = dict(of_its_own.reasons) if of_its_own else {}
        if column.kind == "intercept" and model.study_design in CASE_CONTROL:
            reasons |= dict.fromkeys(("odds_ratio", "wald", "profile"), say("intercept-of-case-control"))
            numbers = _Numbers()
        elif not column.shown and column.kind != "intercept":
            reasons |= dict.fromkeys(
                ("odds_ratio", "wald", "profile"), say("column-without-own-odds-ratio", term=column.term)
            )
            numbers = _Numbers()
        elif position in finite:
            numbers = _finite(model, separated, position, column, limits, finite.index(position), reasons)
        else:
            numbers = _infinite(one_sided[position], column, reasons)
        found.append(
            CoefficientResult(
                term=column.term,
                level=column.level,
                reference=column.reference,
                levels=column.levels,
                role=column.role,
                label=column.label,
                log_odds_ratio=numbers.estimate,
                standard_error=numbers.standard_error,
                odds_ratio=None if numbers.estimate is None else exponential(numbers.estimate),
                wald=numbers.wald,
                profile=numbers.profile,
                shown=column.shown,
                crude=of_its_own.same if of_its_own else None,
                crude_all_records=of_its_own.all_records if of_its_own else None,
                reasons=reasons,
            )
        )
    return tuple(found)


class _Numbers:
    def __init__(self) -> None:
        self.estimate: float | None = None
        self.standard_error: float | None = None
        self.wald = WaldResult(None, None, None)
        self.profile = ProfileResult(None, None)


def _finite(
    model: FittedModel,
    separated: Separated,
    position: int,
    column: DesignColumn,
    limits: ProfileLimits | None,
    place: int,
    reasons: dict[str, str],
) -> _Numbers:
    numbers = _Numbers()
    estimate, error = separated.part.coefficients[position], separated.part.standard_errors[position]
    if estimate is None or error is None or limits is None:
        reasons |= dict.fromkeys(
            ("log_odds_ratio", "standard_error", "odds_ratio", "wald", "profile"), say("finite-part-not-settled")
        )
        return numbers
    numbers.estimate, numbers.standard_error = estimate * column.per, error * abs(column.per)
    numbers.wald = wald_result(numbers.estimate, numbers.standard_error, model.level, reasons)
    numbers.profile = profile_result(limits, place, column.per, reasons)
    return numbers


def _infinite(one: OneSidedLimit, column: DesignColumn, reasons: dict[str, str]) -> _Numbers:
    """No estimate and no Wald limits; the limit on one side where the profile has it, or that the profile is flat."""
    numbers = _Numbers()
    if one.status == "flat":
        words = say("profile-is-flat")
    elif one.limit is None:
        words = say("no-finite-estimate", above=(one.kind == "plus infinity") == (column.per > 0), limit=None)
    else:
        above = (one.status == "at or above") == (column.per > 0)
        limit = exponential(one.limit * column.per)
        words = say("no-finite-estimate", above=above, limit=None if limit is None else ratio(limit))
        numbers.profile = ProfileResult(limit, None) if above else ProfileResult(None, limit)
    reasons |= dict.fromkeys(("log_odds_ratio", "standard_error", "odds_ratio", "wald", "profile"), words)
    return numbers
