"""Hosmer and Lemeshow's test: observed against expected counts in groups of the fitted probability."""

from __future__ import annotations

import numpy as np

from oddsmodel.checks.one_pass import one_pass
from oddsmodel.checks.probability_groups import TENTHS, Array, OrderedRecords, group_table, grouped
from oddsmodel.checks.severity import severity
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.wording import finding, say

MOST_RECORDS = 25_000
FEWEST_GROUPS = 6
DISTINCT_A_GROUP = 5
"""Fewer distinct fitted probabilities a group, and the groups are nearly the covariate patterns themselves: each
parameter then takes a degree of freedom, not two in all."""
OWN_PROBABILITY = 0.8
"""Share of records with a fitted probability of their own from which patterns are not few, however few the records."""
VARIANCE_RATIO = (0.5, 2.0)
SMALL = 500


def groups_wanted(records: int, events: int) -> int:
    """10 groups up to 1,000 records, then max(10, min(m/2, (n − m)/2, 2 + 8(n/1000)²)), m events of n records.

    Paul, Pennell & Lemeshow 2013, Statistics in Medicine 32:67-80: this many keep the power about the same at any n.
    """
    if records <= 1000:
        return TENTHS
    return max(TENTHS, int(min(events / 2, (records - events) / 2, 2 + 8 * (records / 1000) ** 2)))


def check(model: FittedModel) -> CheckResult:
    """sum over groups of (O − E)² / (E (1 − E/n)), chi-square with groups − 2 degrees of freedom.

    Hosmer & Lemeshow 1980, Communications in Statistics A9:1043-1069. E/n is the group's mean fitted probability.
    Withheld, with the reason, where its chi-square distribution is not to be trusted: see `_left_out` and `_withheld`.
    """
    ordered = one_pass(model).ordered
    table = group_table(ordered.tenths, cases=model.study_design not in QUANTITY)
    title, explanation = say("hosmer-lemeshow-title"), say("hosmer-lemeshow-explanation")
    reason = _left_out(model)
    groups = ordered.tenths if reason else grouped(ordered, groups_wanted(model.records, model.events))
    formed = int(groups.records.size)
    reason = reason or _withheld(model, ordered, groups)
    if reason is not None:
        nothing = dict.fromkeys(("groups", "statistic", "df", "p"))
        return CheckResult(
            name="hosmer_lemeshow",
            family="fit",
            title=title,
            verdict="not applicable",
            line=reason,
            statistics=nothing,
            reasons=dict.fromkeys(nothing, reason),
            tables=(table,),
            explanation=explanation,
        )
    statistic = float(((groups.events - groups.expected) ** 2 / _binomial_variance(groups)).sum())
    df = formed - 2
    p = chi_square_p(statistic, df)
    verdict: Verdict = "fine" if p >= 0.05 else "look" if p >= 0.01 else "caution"
    facts = {"groups": formed, "statistic": statistic, "df": df, "p": p, "few": model.records < SMALL}
    return CheckResult(
        name="hosmer_lemeshow",
        family="fit",
        title=title,
        verdict=verdict,
        line=say("hosmer-lemeshow-line", **facts),
        statistics={"groups": formed, "statistic": statistic, "df": df, "p": p},
        findings=() if verdict == "fine" else (finding(severity(verdict), "hosmer-lemeshow-misfit", **facts),),
        tables=(table,),
        explanation=explanation,
    )


def _binomial_variance(groups: OrderedRecords) -> Array:
    """E (1 − E/n) of each group, without loss where E comes near 0 or n."""
    return groups.expected * (groups.unexpected / groups.records)


def _left_out(model: FittedModel) -> str | None:
    """Why there is no test for such records, whatever their counts, or None.

    Records that belong to groups are not independent; with more than 25,000, misfit too small to matter is found (Paul
    et al. 2013).
    """
    if model.grouping is not None:
        return say("no-check-of-grouped-records")
    if model.records > MOST_RECORDS:
        return say("hosmer-lemeshow-too-many-records", most=MOST_RECORDS)
    return None


def _withheld(model: FittedModel, ordered: OrderedRecords, groups: OrderedRecords) -> str | None:
    """Why the counts allow no test, or None.

    1. Fewer than 6 groups formed: hardly any misfit is found (Hosmer & Lemeshow 2000, section 5.2.2, from
       memory).
    2. Covariate patterns are few: fewer than five distinct fitted probabilities a group, unless four in five records
       have one of their own.
    3. Expected counts too small (or groups of a record or two): the statistic's variance under the fitted model,
       2(g − 2) + sum of κ4/V² over the g groups, with V and κ4 the variance and the fourth cumulant of the group's
       count, is not between half and twice that of chi-square.
    4. No intercept in the span of the columns: events and their expectations then have different totals.
    """
    formed, distinct = int(groups.records.size), int(ordered.records.size)
    surplus = abs(float(ordered.events.sum() - ordered.expected.sum()))
    if formed < FEWEST_GROUPS:
        return say("hosmer-lemeshow-few-groups", groups=formed, fewest=FEWEST_GROUPS)
    if distinct < DISTINCT_A_GROUP * formed and distinct < OWN_PROBABILITY * model.records:
        return say("hosmer-lemeshow-few-patterns", groups=formed, distinct=distinct, least=DISTINCT_A_GROUP)
    if not (_binomial_variance(groups) > 0.0).all():
        return say("hosmer-lemeshow-small-expected", groups=formed)
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        ratio = 1.0 + float((groups.fourth / groups.variance**2).sum()) / (2.0 * (formed - 2))
    if not VARIANCE_RATIO[0] <= ratio <= VARIANCE_RATIO[1]:
        return say("hosmer-lemeshow-small-expected", groups=formed)
    if surplus > 1e-6 * float(np.sqrt(ordered.variance.sum())):
        return say("hosmer-lemeshow-no-intercept")
    return None
