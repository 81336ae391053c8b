"""Likelihood-ratio tests of every term by marginality, of the exposure and of the whole model, in shared passes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.design.marginality import restricted_columns
from oddsmodel.inference import Fit, Problem, likelihood_ratio, maximise_all
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import TermTest

EXPOSURE = "all exposure columns"
WHOLE = "whole model"


@dataclass(frozen=True)
class TermTests:
    tests: tuple[TermTest, ...]
    null_log_likelihood: float


def term_tests(model: FittedModel) -> TermTests:
    """Drop each term, with both models leaving out every term that strictly contains it (marginality, Nelder 1977).

    All restricted fits are maximised side by side from the full fit's quadratic approximation. The null model
    holds the intercept only (nothing where the formula has none).
    """
    design = model.design
    p = len(design.columns)
    everything = tuple(range(p))
    intercept = tuple(i for i, column in enumerate(design.columns) if column.role == "intercept")
    pairs: list[tuple[str, tuple[int, ...], tuple[int, ...]]] = []
    for term in design.terms:
        if term.name != "Intercept":
            larger, smaller = restricted_columns(design, term)
            pairs.append((term.name, tuple(larger), tuple(smaller)))
    exposure = set(model.exposure_indices)
    pairs.append((EXPOSURE, everything, tuple(i for i in everything if i not in exposure)))
    pairs.append((WHOLE, everything, intercept))

    spaces = sorted({columns for _, larger, smaller in pairs for columns in (larger, smaller)} - {everything})
    identity = np.eye(p)
    fits = maximise_all(model.likelihood, [Problem(identity[:, list(s)]) for s in spaces], near=model.fit)
    found: dict[tuple[int, ...], Fit] = {everything: model.fit, **dict(zip(spaces, fits, strict=True))}
    tests = tuple(
        _test(name, found[larger], found[smaller]) for name, larger, smaller in pairs if len(larger) > len(smaller)
    )
    return TermTests(tests, found[intercept].log_likelihood)


def _test(name: str, larger: Fit, smaller: Fit) -> TermTest:
    settled = {"converged", "no finite maximum"}
    if larger.status not in settled or smaller.status not in settled:
        return TermTest(name, 1, None, None, "A model that this test compares did not settle.")
    statistic, df, p = likelihood_ratio(larger, smaller)
    return TermTest(name, df, statistic, p)
