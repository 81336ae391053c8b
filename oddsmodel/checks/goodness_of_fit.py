"""Further tests of fit, and one sentence that weighs them with the size of the misfit and what they could find."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from oddsmodel.checks import (
    hosmer_lemeshow,
    information_matrix,
    link_test,
    standardised_pearson,
    stukel,
    unweighted_squares,
)
from oddsmodel.checks.added_columns import AddedColumns, FitTest, Maker, add_columns, distance_of, withheld
from oddsmodel.checks.added_fits import likelihood_ratio_tests
from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.severity import severity
from oddsmodel.findings import Finding
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import finding, say

NAME = "goodness_of_fit"

TESTS = (
    "hosmer_lemeshow",
    standardised_pearson.NAME,
    unweighted_squares.NAME,
    stukel.NAME,
    link_test.NAME,
    information_matrix.NAME,
)
"""Those that the sentence weighs."""

REFITTED = (stukel.NAME, link_test.NAME)
"""Those also done by a likelihood ratio, which stands beside and is not counted again."""

STANDARDISED = (standardised_pearson.NAME, unweighted_squares.NAME)
"""Those whose standardised sum goes into the results: its sign has a meaning."""

DOUBT, STRONG = 0.05, 0.01
SMALL = 0.05
"""Misfit is small where what a test sees of it moves fewer records than this share of those with the rarer outcome."""

FOUND_MOSTLY = 0.8
"""How often a misfit is found that is said to be mostly found."""

OF_RISKS = ("mean_gap", "largest_gap", "found_mostly_shift")
"""Numbers that only designs have whose records tell risks."""

LARGEST_LOG = math.log(1000.0)


@dataclass(frozen=True, slots=True)
class Sizes:
    """How large a misfit is, or would have to be.

    records, rarer: all, and those with the rarer outcome. variance: the sum of p(1 − p) over them.
    mean_gap, largest_gap: difference of observed and fitted shares over tenths of the fitted probability. apart: the
    differences of their counts added up, over `rarer`. distance: how many standard errors the counts are off, with what
    chance adds taken away.
    """

    records: int
    rarer: int
    variance: float
    mean_gap: float
    largest_gap: float
    apart: float
    distance: float

    @classmethod
    def of(cls, model: FittedModel) -> Sizes:
        ordered = one_pass(model).ordered
        tenths = ordered.tenths
        off = np.abs(tenths.events - tenths.expected)
        rarer = max(1, min(model.events, model.records - model.events))
        squares = np.divide(off**2, tenths.variance, out=np.zeros_like(off), where=tenths.variance > 0.0)
        return cls(
            records=model.records,
            rarer=rarer,
            variance=float(ordered.variance.sum()),
            mean_gap=float(off.sum() / tenths.records.sum()),
            largest_gap=float((off / tenths.records).max()),
            apart=float(off.sum() / rarer),
            distance=distance_of(float(squares.sum()), tenths.records.size - 2),
        )

    def moved_by(self, distance: float) -> float:
        """The share of the rarer outcome that a misfit moves which lies so many standard errors off: see `shift`."""
        return distance * math.sqrt(self.variance) / self.rarer

    def shift(self, distance: float, absolute: bool) -> float | None:
        """What a misfit of so many standard errors does to the fitted probabilities.

        Added columns that shift the linear predictors by d have the expected score statistic sum of p(1 − p)d², the
        squared distance. So the shifts p(1 − p)|d| of the probabilities are at most sqrt(distance² · sum of p(1 − p))
        in all (Cauchy & Schwarz), and this over the records on average: `absolute`. Else the factor by which the odds
        shift, from the root of the mean of d², weighted by p(1 − p); None where that is beyond telling. Where misfit
        lies only in part along the columns of a test, this is the shift by that part.
        """
        if absolute:
            return distance * math.sqrt(self.variance) / self.records
        logarithm = distance / math.sqrt(self.variance)
        return math.exp(logarithm) if logarithm < LARGEST_LOG else None


def check(model: FittedModel) -> CheckResult:
    """Five tests of fit beside Hosmer and Lemeshow's, their smallest p by Holm, and the size of the misfit.

    None of them rests on the intercept: in a case-control study they compare outcomes and probabilities among these
    records, for which a logistic model holds where it does for the population (Prentice & Pyke 1979, Biometrika
    66:403-411). With many records the smallest misfit is found, so that its size decides: see `Weighed`.
    """
    reason = _left_out(model)
    if reason is not None:
        return _result(
            model, dict.fromkeys(TESTS, withheld(reason)), dict.fromkeys(REFITTED, withheld(reason)), None, reason
        )
    added, tests = fit_tests(model)
    ratios = likelihood_ratio_tests(model, added, REFITTED)
    return _result(model, tests, ratios, Sizes.of(model), say("goodness-no-test"))


def fit_tests(model: FittedModel) -> tuple[AddedColumns, dict[str, FitTest]]:
    """The tests that are weighed, by name, with the sums that the five are made of."""
    indicators = information_matrix.Indicators.of(model)
    makers: dict[str, tuple[Maker, int]] = {
        standardised_pearson.NAME: (standardised_pearson.column, 1),
        unweighted_squares.NAME: (unweighted_squares.column, 1),
        stukel.NAME: (stukel.columns, 2),
        link_test.NAME: (link_test.column, 1),
        information_matrix.NAME: (indicators, indicators.centres.size),
    }
    added = add_columns(model, makers)
    return added, {
        "hosmer_lemeshow": _hosmer_lemeshow(model),
        standardised_pearson.NAME: standardised_pearson.test(added, one_pass(model).sums),
        unweighted_squares.NAME: unweighted_squares.test(added),
        stukel.NAME: stukel.test(added),
        link_test.NAME: link_test.test(added),
        information_matrix.NAME: information_matrix.test(added),
    }


def _left_out(model: FittedModel) -> str | None:
    """Why there is no test at all, or None."""
    if model.grouping is not None:
        return say("no-check-of-grouped-records")
    if model.study_design == "matched case-control":
        return say("goodness-matched")
    return None


def _hosmer_lemeshow(model: FittedModel) -> FitTest:
    result = hosmer_lemeshow.check(model)
    statistic, df, p = (result.statistics[name] for name in ("statistic", "df", "p"))
    if statistic is None or df is None or p is None:
        return withheld(result.reasons["p"])
    return FitTest(statistic, int(df), p, distance=distance_of(statistic, int(df)))


@dataclass(frozen=True, slots=True)
class Weighed:
    """The test that objects most, the smallest p with the number of tests allowed for, and whether what it found is
    small: where it moves, and with many records also where tenths move, few of the rarer outcome."""

    tests: int
    smallest: str
    p: float
    many: bool
    small: bool

    @property
    def verdict(self) -> Verdict:
        """From 0.05 on nothing is found. Below it, small misfit is worth a look up to 25,000 records, and with more of
        them, where any is found, fine; other misfit is worth a look, and with p below 0.01 a caution."""
        if self.p >= DOUBT:
            return "fine"
        if self.small:
            return "fine" if self.many else "look"
        return "caution" if self.p < STRONG else "look"


def found_mostly(tests: int) -> float:
    """Standard errors of a misfit that one of so many tests, with one degree of freedom, finds four times in five at
    5% by Holm: the normal quantiles of 1 − 0.025/tests and of 0.8 added.

    >>> round(found_mostly(1), 2), round(found_mostly(6), 2)
    (2.8, 3.48)
    """
    from scipy.special import ndtri

    return float(ndtri(1.0 - DOUBT / 2.0 / tests) + ndtri(FOUND_MOSTLY))


def weighed(tests: Mapping[str, FitTest], sizes: Sizes) -> Weighed | None:
    """What the tests say together; None where there is none. The first step of Holm 1979 (Scandinavian Journal of
    Statistics 6:65-70): the smallest p times the number of tests."""
    done = {name: test.p for name, test in tests.items() if test.p is not None}
    if not done:
        return None
    smallest = min(done, key=lambda name: done[name])
    many = sizes.records > hosmer_lemeshow.MOST_RECORDS
    distance = tests[smallest].distance
    if many or distance is None:
        distance = max(distance or 0.0, sizes.distance)
    p = min(1.0, len(done) * done[smallest])
    return Weighed(len(done), smallest, p, many, sizes.moved_by(distance) <= SMALL)


def _result(
    model: FittedModel,
    tests: Mapping[str, FitTest],
    ratios: Mapping[str, FitTest],
    sizes: Sizes | None,
    reason: str,
) -> CheckResult:
    """reason: why there is no test, should there be none."""
    absolute = model.study_design in QUANTITY
    together = None if sizes is None else weighed(tests, sizes)
    statistics, reasons = _statistics(tests, ratios)
    statistics |= {"tests": 0, **dict.fromkeys(("smallest_p_adjusted", *OF_RISKS, "found_mostly_odds"))}
    line, told = reason, dict[str, str]()
    verdict: Verdict = "not applicable"
    findings: tuple[Finding, ...] = ()
    if sizes is not None:
        if absolute:
            statistics |= {"mean_gap": sizes.mean_gap, "largest_gap": sizes.largest_gap}
        else:
            told |= dict.fromkeys(OF_RISKS, say("goodness-no-risk", design=model.study_design))
    if sizes is not None and together is not None:
        enough = found_mostly(together.tests)
        statistics |= {"tests": together.tests, "smallest_p_adjusted": together.p}
        statistics["found_mostly_odds"] = sizes.shift(enough, absolute=False)
        told["found_mostly_odds"] = say("goodness-beyond-telling")
        if absolute:
            statistics["found_mostly_shift"] = sizes.shift(enough, absolute=True)
        distance = tests[together.smallest].distance
        facts = {
            "tests": together.tests,
            "smallest": together.smallest,
            "p": together.p,
            "analysed_records": sizes.records,
            "many": together.many,
            "small": together.small,
            "absolute": absolute,
            "mean_gap": sizes.mean_gap,
            "largest_gap": sizes.largest_gap,
            "apart": sizes.apart,
            "shift": None if distance is None else sizes.shift(distance, absolute),
            "found": sizes.shift(enough, absolute),
        }
        line, verdict = say("goodness-line", **facts), together.verdict
        findings = () if verdict == "fine" else (finding(severity(verdict), "goodness-line", **facts),)
    reasons |= {name: told.get(name, reason) for name in statistics if statistics[name] is None and name not in reasons}
    return CheckResult(
        name=NAME,
        family="fit",
        title=say("goodness-title"),
        verdict=verdict,
        line=line,
        statistics=statistics,
        reasons=reasons,
        findings=findings,
        tables=() if sizes is None or together is None else (_table(tests, ratios, sizes, absolute),),
        explanation=say("goodness-explanation", single=model.rows.single, cases=not absolute),
    )


def _statistics(
    tests: Mapping[str, FitTest], ratios: Mapping[str, FitTest]
) -> tuple[dict[str, float | int | None], dict[str, str]]:
    """The numbers of every test but Hosmer and Lemeshow's, which is a check of its own; and why one is not there."""
    named = {name: test for name, test in tests.items() if name != "hosmer_lemeshow"}
    named |= {f"{name}_likelihood_ratio": test for name, test in ratios.items()}
    statistics: dict[str, float | int | None] = {}
    reasons: dict[str, str] = {}
    for name, test in named.items():
        own: dict[str, float | int | None] = {name: test.statistic, f"{name}_df": test.df, f"{name}_p": test.p}
        if name in STANDARDISED:
            own[f"{name}_z"] = test.score
        statistics |= own
        reasons |= {key: test.reason for key, value in own.items() if value is None}
    return statistics, reasons


def _table(tests: Mapping[str, FitTest], ratios: Mapping[str, FitTest], sizes: Sizes, absolute: bool) -> Table:
    columns = (
        TableColumn("test", say("goodness-heading-test")),
        TableColumn("looks_for", say("goodness-heading-looks-for")),
        TableColumn("statistic", say("goodness-heading-statistic"), "number"),
        TableColumn("df", say("goodness-heading-df"), "number"),
        TableColumn("p", say("goodness-heading-p"), "p"),
        TableColumn("shift", say("goodness-heading-shift", absolute=absolute), "number"),
    )
    rows: list[tuple[Cell, ...]] = []
    for name, test in tests.items():
        shift = None if test.distance is None else sizes.shift(test.distance, absolute)
        if shift is not None and absolute:
            shift *= 100.0
        words = say(f"goodness-{name}"), say(f"goodness-{name}-looks-for")
        rows.append((*words, test.statistic, test.df, test.p, shift))
        if name in ratios:
            ratio = ratios[name]
            words = say(f"goodness-{name}-ratio"), say("goodness-ratio")
            rows.append((*words, ratio.statistic, ratio.df, ratio.p, None))
    return Table(NAME, say("goodness-table"), columns, tuple(rows), note=say("goodness-note"))
