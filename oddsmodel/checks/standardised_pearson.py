"""The standardised Pearson statistic: for records or patterns too sparse for a chi-square of their counts."""

from __future__ import annotations

import math

import numpy as np

from oddsmodel.checks.added_columns import (
    ALIASED,
    HEAVIEST,
    AddedColumns,
    Array,
    FittedRows,
    FitTest,
    distance_of,
    withheld,
)
from oddsmodel.checks.one_pass import Sums
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.wording import say

NAME = "standardised_pearson"

FEWEST = 20
"""Patterns beyond the coefficients from which a sum over them counts as near normal."""


def column(rows: FittedRows) -> Array:
    """(1 − 2p) / (n p (1 − p)) (m, 1)."""
    return np.asarray((rows.lean / rows.variance)[:, None])


def test(added: AddedColumns, sums: Sums) -> FitTest:
    """Pearson's X² over the m covariate patterns (or records), less its mean, over its standard deviation.

    Osius & Rojek 1992, Journal of the American Statistical Association 87:1145-1152. The variance is

        2 (m − sum of 1/n) + RSS,

    with RSS left over by the regression of c = (1 − 2p)/(np(1 − p)) on the model's columns with weights np(1 − p), as
    Hosmer et al. 1997 (Statistics in Medicine 16:965-980) compute it. The mean they take, m less the coefficients, is
    that of large patterns; for single records it is far off where probabilities are all near 1/2, since X² is then m
    whatever the outcomes. Here it is taken to the second order for any n (as McCullagh 1985, International Statistical
    Review 53:61-67, does for Pearson's statistic in general): with h the leverages and r what the regression leaves of
    c,

        m − sum of h (1 − 1/n) − (1/2) sum of r (1 − 2p) h.
    """
    place = added.places[NAME].start
    rss, size, fourth = float(added.information[place, place]), float(added.size[place]), float(added.fourth[place])
    if not math.isfinite(sums.pearson + rss + size + fourth + float(added.tilt[place])):
        return withheld(say("goodness-edge"))
    if sums.patterns - added.parameters < FEWEST:
        return withheld(say("goodness-few-patterns", patterns=sums.patterns, fewest=FEWEST))
    if not added.enough(1):
        return withheld(added.too_few())
    variance = max(0.0, 2.0 * (sums.patterns - added.inverse_trials)) + rss
    if variance <= ALIASED * max(size, sums.patterns):
        return withheld(say("goodness-nothing-left"))
    if abs(fourth) > HEAVIEST * variance**2:
        return withheld(say("goodness-edge"))
    mean = sums.patterns - added.taken - 0.5 * float(added.tilt[place])
    score = (sums.pearson - mean) / math.sqrt(variance)
    statistic = score * score
    # of single records it is the score of a column; of patterns it also has their counts' own squares
    single = added.inverse_trials == sums.patterns
    distance = distance_of(statistic, 1) if single else None
    return FitTest(statistic, 1, chi_square_p(statistic, 1), score=score, distance=distance)
