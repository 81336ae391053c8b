"""Likelihood-ratio tests of every term by marginality, of the exposure and of the whole model, in shared passes."""

from __future__ import annotations

from dataclasses import dataclass
from math import log

import numpy as np
from scipy.special import xlogy

from oddsmodel.checks.nearby import PART_FROM, Known, Nearby, maxima_near
from oddsmodel.design.constant import indicators_of_all_levels
from oddsmodel.design.marginality import restricted_columns
from oddsmodel.inference import Problem, maximise_all
from oddsmodel.inference.penalised import maximise_penalised
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.likelihood import JeffreysPenalisedLikelihood
from oddsmodel.measures.wald_f import contrasts_without, wald_f
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.study import TermTest
from oddsmodel.wording import say

EXPOSURE = "all exposure columns"
WHOLE = "whole model"


@dataclass(frozen=True)
class TermTests:
    """null_log_likelihood: None where the records are grouped and so have no likelihood."""

    tests: tuple[TermTest, ...]
    null_log_likelihood: float | None


@dataclass(frozen=True)
class Maximum:
    """The log-likelihood at the maximum over a space, None where it was not settled, and the space's dimension."""

    log_likelihood: float | None
    dimension: int


def term_tests(model: FittedModel) -> TermTests:
    """Drop each term, with both models leaving out every term that strictly contains it (marginality, Nelder 1977).

    All restricted fits are maximised side by side from the full fit's quadratic approximation. The null model
    holds the intercept only. Where the formula has no intercept but gives every level of a column an indicator of
    its own, their sum is one: the smaller model then keeps that sum, so that what is tested is whether the levels
    differ and not whether all odds are 1. The null model is that sum too, or nothing where there is neither.
    """
    design = model.design
    p = len(design.columns)
    everything = tuple(range(p))
    intercept = tuple(i for i, column in enumerate(design.columns) if column.role == "intercept")
    ones = indicators_of_all_levels(design)
    pairs: list[tuple[str, tuple[int, ...], tuple[int, ...]]] = []
    for term in design.terms:
        if term.name != "Intercept":
            larger, smaller = restricted_columns(design, term)
            pairs.append((term.name, tuple(larger), tuple(smaller)))
    exposure = set(model.exposure_indices)
    pairs.append((EXPOSURE, everything, tuple(i for i in everything if i not in exposure)))
    pairs.append((WHOLE, everything, intercept))

    if model.grouping is not None:
        return TermTests(tuple(_wald(model, name, larger, smaller, ones) for name, larger, smaller in pairs), None)
    found = {everything: Maximum(model.fit.log_likelihood, model.fit.dimension)}
    if model.method == "maximum likelihood":
        found[intercept] = _null(model, bool(intercept or ones))
    spaces = sorted({columns for _, larger, smaller in pairs for columns in (larger, smaller)} - set(found))
    maxima = _maxima(model, [_basis(p, columns, ones) for columns in spaces])
    found.update(zip(spaces, maxima, strict=True))
    tests = tuple(
        _test(name, found[larger], found[smaller])
        for name, larger, smaller in pairs
        if found[larger].dimension > found[smaller].dimension
    )
    return TermTests(tests, null_log_likelihood(model))


def null_log_likelihood(model: FittedModel) -> float | None:
    """Of the model without any column but the constant, where it holds that; without the penalty or the prior."""
    constant = any(column.role == "intercept" for column in model.design.columns)
    return _null(model, constant or bool(indicators_of_all_levels(model.design))).log_likelihood


def _null(model: FittedModel, constant: bool) -> Maximum:
    """All odds equal, or all 1 where the model does not hold the constant."""
    records, events = float(model.records), float(model.events)
    if not constant:
        return Maximum(-records * log(2.0), 0)
    rest = records - events
    return Maximum(float(xlogy(events, events / records) + xlogy(rest, rest / records)), 1)


def _maxima(model: FittedModel, spaces: list[Array]) -> list[Maximum]:
    """The maximum over each space: near the full fit where rows are many, by full Newton steps where that is not so."""
    fit = model.fit
    if isinstance(model.likelihood, JeffreysPenalisedLikelihood):
        return [_highest(model.likelihood, space) for space in spaces]
    near: list[Nearby | None] = [None] * len(spaces)
    if model.rows.number > PART_FROM and spaces and model.method == "maximum likelihood":
        known = Known(fit.working, np.zeros_like(fit.working), fit.working_information)
        near = maxima_near(fit.space.working, known, [fit.space.gamma(space.T).T for space in spaces])
    far = [Problem(space) for space, one in zip(spaces, near, strict=True) if one is None]
    whole = iter(maximise_all(model.likelihood, far, near=fit) if far else ())
    found: list[Maximum] = []
    for one, space in zip(near, spaces, strict=True):
        if one is not None:
            found.append(Maximum(one.log_likelihood, space.shape[1]))
            continue
        other = next(whole)
        settled = other.status in ("converged", "no finite maximum")
        found.append(Maximum(other.log_likelihood if settled else None, other.dimension))
    return found


def _highest(likelihood: JeffreysPenalisedLikelihood, space: Array) -> Maximum:
    """The highest maximum over a space of a penalised likelihood, which keeps the penalty of the whole model."""
    if space.shape[1] == 0:
        value = float(likelihood.evaluate(np.zeros(space.shape[0]), information=False).log_likelihood[0])
        return Maximum(value, 0)
    fit = maximise_penalised(likelihood, basis=space).fit
    return Maximum(fit.log_likelihood if fit.status == "converged" else None, fit.dimension)


def _wald(
    model: FittedModel, name: str, larger: tuple[int, ...], smaller: tuple[int, ...], ones: tuple[int, ...]
) -> TermTest:
    """F of the columns that the smaller model lacks, where records are grouped.

    The larger model is fitted again where it is not the model itself: each has its own cluster-robust covariance.
    """
    p = len(model.design.columns)
    space = np.eye(p)[:, list(larger)]
    within: Array = np.asarray(np.linalg.lstsq(space, _basis(p, smaller, ones), rcond=None)[0], dtype=np.float64)
    df = len(larger) - int(np.linalg.matrix_rank(within))
    found = contrasts_without(model, larger)
    test = None if found is None else wald_f(*found, within)
    reason = "wald-f-in-its-place" if test is not None else "no-term-test-of-groups"
    return TermTest(name, df, None, None, say(reason), test)


def _basis(parameters: int, columns: tuple[int, ...], ones: tuple[int, ...]) -> Array:
    """The space of the columns kept (p, r), and of the sum of `ones` where not all of those are among them."""
    basis = np.eye(parameters)[:, list(columns)]
    if not ones or set(ones) <= set(columns):
        return basis
    total = np.zeros((parameters, 1))
    total[list(ones)] = 1.0
    return np.hstack([basis, total])


def _test(name: str, larger: Maximum, smaller: Maximum) -> TermTest:
    df = larger.dimension - smaller.dimension
    if larger.log_likelihood is None or smaller.log_likelihood is None:
        return TermTest(name, df, None, None, say("term-test-not-settled"))
    statistic = max(0.0, 2.0 * (larger.log_likelihood - smaller.log_likelihood))
    return TermTest(name, df, statistic, chi_square_p(statistic, df))
