"""Records that belong together in groups: which group each is of, and the covariance that allows for it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.encoder import Design
from oddsmodel.design.patterns import Patterns
from oddsmodel.inference.clustered import clustered_covariance, small_sample_factor, within_one_group
from oddsmodel.inference.maximise import Fit

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Grouping:
    """The groups of the n records of a model.

    column, label: the record column that names them. codes (n,): the group of each record, from 0. number: of groups.
    covariance (p, p): cluster-robust; None with a single group. without_error (p,): coefficients whose column is the
    mark of a single group (or is lacking in a single one), which have no standard error.
    """

    column: str
    label: str
    codes: NDArray[np.intp]
    number: int
    covariance: Array | None
    without_error: NDArray[np.bool_]

    @property
    def df(self) -> int | None:
        """Degrees of freedom of t, number of groups − 1 (Cameron & Miller 2015, section VI.D); None with one group."""
        return self.number - 1 if self.number > 1 else None

    def standard_error(self, contrast: Array) -> float | None:
        """That of contrast'β, contrast (p,); None where a coefficient in it has none."""
        if self.covariance is None or self.without_error[contrast != 0.0].any():
            return None
        return float(np.sqrt(max(0.0, float(contrast @ self.covariance @ contrast))))


def group_codes(values: pd.Series) -> tuple[NDArray[np.intp], int]:
    """Codes (n,) from 0 in the order met, −1 where not recorded, and how many groups there are."""
    codes, found = pd.factorize(values)
    return np.asarray(codes, dtype=np.intp), len(found)


def grouping(
    column: str,
    label: str,
    values: pd.Series,
    event: NDArray[np.bool_],
    counts: Array | None,
    design: Design,
    patterns: Patterns,
    fit: Fit,
) -> Grouping:
    """The groups of a fitted model's records, all of which have a group, and the covariance of its coefficients."""
    codes, number = group_codes(values)
    p = fit.coefficients.size
    factor = small_sample_factor(number, float(patterns.trials.sum()), p)
    covariance = None
    if factor is not None:
        covariance = clustered_covariance(fit, patterns.index, event, codes, factor, counts)
    return Grouping(column, label, codes, number, covariance, _marks_of_one_group(design, patterns, codes))


def _marks_of_one_group(design: Design, patterns: Patterns, codes: NDArray[np.intp]) -> NDArray[np.bool_]:
    X, index = patterns.X, patterns.index
    found = np.zeros(X.shape[1], dtype=np.bool_)
    binary = ((X == 0.0) | (X == 1.0)).all(axis=0)
    for position, column in enumerate(design.columns):
        if column.kind != "intercept" and binary[position]:
            found[position] = within_one_group((X[:, position] == 1.0)[index], codes)
    for term in design.terms:
        own = slice(term.start, term.stop)
        if term.stop - term.start > 1 and binary[own].all():
            # Their reference is a level as well, and may be that of a single group.
            others = (X[:, own].sum(axis=1) > 0.0)[index]
            if (~others).any() and within_one_group(~others, codes):
                found[own] = True
    return found
