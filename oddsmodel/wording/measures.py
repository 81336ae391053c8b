"""Sentences of the measures floor, by code."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.measures_lost import LOST
from oddsmodel.wording.numbers import count, decimal, listed, percent, ratio
from oddsmodel.wording.say import Sentence


def _too_large(facts: Mapping[str, Any]) -> str:
    return (
        f"{count(facts['tables'])} tables share these margins, more than the {count(facts['most'])} up to which exact "
        "limits are computed; where no cell is small, Woolf's interval is as good in a table of this size."
    )


def _moved(facts: Mapping[str, Any]) -> str:
    because = " for chance imbalance" if facts["trial"] else ""
    crude, adjusted = ratio(facts["crude"]), ratio(facts["adjusted"])
    if crude == adjusted:
        return f"{facts['label']}: the odds ratio is {crude} before and after adjustment{because}"
    return f"{facts['label']}: the odds ratio goes from {crude} to {adjusted} on adjustment{because}"


def _moved_with_change(facts: Mapping[str, Any]) -> str:
    change = decimal(facts["change"], 0)
    if change == "0":
        return f"{_moved(facts)}, a change of less than 1%."
    return f"{_moved(facts)}, a change of {change}%."


def _overstates(facts: Mapping[str, Any]) -> str:
    return (
        f"The event happened to {percent(facts['share'])} of the records. Above 10% an odds ratio lies noticeably "
        f"further from 1 than the {facts['quantity']} ratio: read as a {facts['quantity']} ratio it would overstate it."
    )


def _no_difference(facts: Mapping[str, Any]) -> str:
    return (
        f"No standardised difference for {listed(facts['labels'])}: there are too few values, or no spread within the "
        "groups to measure by."
    )


SENTENCES: dict[str, Sentence] = {
    # 2×2 tables
    "cell-not-a-count": "{value} is not a count.",
    "give-a-count": "Give a whole number of 0 or more.",
    "level-out-of-range": "{value} is not a confidence level.",
    "give-a-level": "Give a number between 0 and 1, such as 0.95.",
    "two-by-two-empty-margin": "The table says nothing about the odds ratio: {margin}.",
    "two-by-two-too-large-for-exact": _too_large,
    "sample-odds-ratio-zero": "The sample odds ratio is 0, which has no finite logarithm: a cell of the table is 0.",
    "sample-odds-ratio-infinite": "The sample odds ratio is infinite: a cell of the table is 0.",
    "woolf-zero-cell": "Woolf's interval divides by every cell of the table, and one is 0.",
    "no-finite-lower-limit": "There is no finite lower limit: the records allow any odds ratio, however near 0.",
    "no-finite-upper-limit": "There is no finite upper limit: the records allow any odds ratio, however large.",
    "two-by-two-title": "{label}: the two groups and their crude odds ratio",
    "two-by-two-note": (
        "The exact limits hold the margins of the table fixed; the exact p-value is twice the smaller tail, so that it "
        "agrees with them. Mid-P counts half of the observed table's probability and is less cautious."
    ),
    # Risks
    "risks-not-in-this-design": "A {design} study does not tell risks, nor their difference or ratio.",
    "use-odds-ratio": "Use the odds ratio.",
    "group-of-nobody": "There is nobody in one of the groups.",
    "risk-ratio-no-events-unexposed": "Nobody unexposed had the event, so there is no {quantity} to divide by.",
    "risk-ratio-interval-no-events": "The interval of the {quantity} ratio needs events in both groups.",
    "risk-ratio-interval-all-events": (
        "Everybody had the event, so the standard error of the {quantity} ratio is 0 whatever the number of records."
    ),
    # Crude estimates
    "crude-without-intercept": "The model has no intercept, so there is no crude odds ratio to set beside it.",
    "crude-of-several-columns": (
        "{term} takes several columns or enters with another column: no single crude odds ratio stands beside it."
    ),
    "crude-same-records": "The records with this column are the ones analysed.",
    "crude-no-contrast": "These records hold only one value of the exposure, so there is nothing to compare.",
    "crude-no-finite-maximum": (
        "The crude odds ratio is not finite: in one of the groups nobody had the event, or everybody had."
    ),
    "crude-beyond-the-model": "Some of these records have a value for which {term} is not defined.",
    "crude-not-estimated": "The crude model could not be estimated.",
    "no-crude-estimate": "There is no crude estimate.",
    # Coefficients
    "odds-ratio-out-of-range": "The odds ratio is too near 0, or too large, to be written as a number.",
    "limit-out-of-range": "This limit is too near 0, or too large, to be written as a number.",
    "limit-not-found": "The search for this limit did not settle.",
    "no-standard-error": "The records do not determine a standard error.",
    "intercept-of-case-control": (
        "In a case-control study the intercept only tells how many controls were taken for each case."
    ),
    "column-without-own-odds-ratio": (
        "One column of {term}: its odds ratio has no meaning apart from the others that change with it."
    ),
    # By level, crude to adjusted
    "exposure-in-several-columns": "{label} (see its curve or contrasts)",
    "levels-note": (
        "Intervals are profile-likelihood limits, or Wald limits where there are none. "
        "Crude: the exposure alone, on the same records as the adjusted estimate."
    ),
    "levels-note-unadjusted": (
        "Intervals are profile-likelihood limits, or Wald limits where there are none. The model adjusts for nothing, "
        "so its odds ratios are the crude ones."
    ),
    "levels-note-other-method": (
        "Crude odds ratios are by maximum likelihood, with profile-likelihood limits, or Wald limits where there are "
        "none. The model adjusts for nothing; its own odds ratios, by another method, stand among the estimates."
    ),
    "levels-note-exact": "The adjusted intervals are exact.",
    "crude-beside-adjusted-note": (
        "Crude and adjusted rest on the same records. The difference of logs is the adjusted log odds ratio less the "
        "crude one; the change is that of the odds ratio, as a percentage of the crude one. Where more records have "
        "the exposure than could be analysed, the last columns give the crude odds ratio on all of them."
    ),
    "crude-to-adjusted": lambda facts: f"{_moved(facts)}.",
    "crude-to-adjusted-with-change": _moved_with_change,
    "no-change-to-tell": "{label}: there is no pair of crude and adjusted odds ratios to compare.",
    "percent-change-of-almost-nothing": (
        "No percentage change: the crude log odds ratio is smaller than its standard error."
    ),
    "crude-without-standard-error": "No percentage change: the crude estimate has no standard error.",
    "noncollapsibility": (
        "Odds ratios change on adjustment even where nothing confounds, mostly away from 1, because they cannot be "
        "averaged over the groups (Greenland, Robins & Pearl, 1999). The change is not a measure of confounding."
    ),
    "adjustment-in-a-trial": (
        "In a trial the groups differ by chance imbalance only. Adjustment corrects for it, and also moves the odds "
        "ratio further from 1 where nothing is out of balance, because odds ratios cannot be averaged over the groups "
        "(Greenland, Robins & Pearl, 1999)."
    ),
    "odds-ratio-overstates-risk-ratio": _overstates,
    "odds-ratio-overstates-risk-ratio-withheld": (
        "The event is common among these records. An odds ratio then lies noticeably further from 1 than the risk "
        "ratio: read as a risk ratio it would overstate it."
    ),
    # Models side by side
    "compare-models-note": lambda facts: (
        f"{facts['levels']} intervals: "
        + ("exact limits where the method is exact, else " if facts["exact"] else "")
        + "profile-likelihood limits, or Wald limits where there are none."
    ),
    "compare-models-one-sided": (
        "{model} has no finite estimate for {label}; its interval has the one limit that there is."
    ),
    "model-added-said": "Added by the program.",
    "compare-models-different-records": (
        "The models rest on different records, so that a part of what differs may come from the records and not from "
        "the adjustment."
    ),
    "compare-models-alt": lambda facts: (
        "Odds ratios of the exposure with their intervals on a log axis, one series for each model: "
        f"{listed(facts['models'])}."
    ),
    "compare-models-withheld": "{model} gives no odds ratio for {label}: {reason}",
    "compare-models-not-estimated": "{model} could not be estimated ({status}).",
    "compare-models-not-in-model": lambda facts: (
        f"{facts['model']} has no odds ratio of its own for {listed(facts['labels'])}."
    ),
    # Who they were
    "groups-case-status": "Shown by case status.",
    "groups-levels": "Shown by {label}.",
    "groups-thirds": "Shown by {groups} groups of {label}, cut at the thirds of the records.",
    "groups-one": "Shown together: {label} has too few distinct values to make groups.",
    "row-records": "Records analysed",
    "characteristics-note": (
        "Of the records analysed, but for the lines “not recorded”, which count all records that belong to the study "
        "and have outcome and exposure. Numbers with a skewness above 1, either way, are told by median and quartiles. "
        "A standardised difference tells how far apart the groups are in standard deviations; one above 0.1 is often "
        "looked at. Unlike a p-value it does not grow with the number of records."
    ),
    "largest-standardised-difference": "With more than two groups it is the largest between any two of them.",
    "no-standardised-difference": _no_difference,
    **LOST,
}
