"""Likelihood-ratio tests of every term by marginality, of the exposure and of the whole model, in shared passes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.design.constant import indicators_of_all_levels
from oddsmodel.design.marginality import restricted_columns
from oddsmodel.inference import Fit, Problem, likelihood_ratio, maximise_all
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
    spaces = sorted({columns for _, larger, smaller in pairs for columns in (larger, smaller)} - {everything})
    problems = [Problem(_basis(p, columns, ones)) for columns in spaces]
    fits = maximise_all(model.likelihood, problems, near=model.fit)
    found: dict[tuple[int, ...], Fit] = {everything: model.fit, **dict(zip(spaces, fits, strict=True))}
    tests = tuple(
        _test(name, found[larger], found[smaller])
        for name, larger, smaller in pairs
        if found[larger].dimension > found[smaller].dimension
    )
    return TermTests(tests, found[intercept].log_likelihood)


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


def _test(name: str, larger: Fit, smaller: Fit) -> TermTest:
    settled = {"converged", "no finite maximum"}
    if larger.status not in settled or smaller.status not in settled:
        df = larger.dimension - smaller.dimension
        return TermTest(name, df, None, None, say("term-test-not-settled"))
    statistic, df, p = likelihood_ratio(larger, smaller)
    return TermTest(name, df, statistic, p)
