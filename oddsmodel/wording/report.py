"""Sentences of the report floor, by code: headings, figures and tables here, the rest in the files it gathers."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, listed, plural
from oddsmodel.wording.report_answer import SENTENCES as ANSWER
from oddsmodel.wording.report_cause import SENTENCES as CAUSE
from oddsmodel.wording.report_methods import SENTENCES as METHODS
from oddsmodel.wording.say import Sentence


def _events(events: int) -> str:
    return f"{count(events)} of them with the event"


def _level(facts: Mapping[str, Any]) -> str:
    return f"{100 * facts['level']:g}%"


def _seen(facts: Mapping[str, Any]) -> str:
    words = (
        f"{facts['source']}: {plural(facts['read'], 'record')} read" if facts["read"] is not None else facts["source"]
    )
    return f"{words}, fingerprint (SHA-256)"


def _certificate(facts: Mapping[str, Any]) -> str:
    digits, condition = facts["digits"], facts["condition"]
    words = (
        f"Each log odds ratio of this model is correct to at least {int(digits)} significant digits"
        if digits is not None
        else "No number of correct digits can be claimed for this model"
    )
    if condition is not None:
        words += f" (condition number of the scaled information: {_size(condition)})"
    return f"{words}. This concerns the arithmetic only, not whether the model is right."


def _size(value: float) -> str:
    if value < 1e5:
        return count(round(value))
    mantissa, exponent = f"{value:.1e}".split("e")
    raised = str(int(exponent)).translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))
    return f"{mantissa} × 10{raised}"


def _differs(facts: Mapping[str, Any]) -> str:
    words = f"Adjusted for {listed(facts['adjustment'])}." if facts["adjustment"] else "Adjusted for nothing."
    if facts["records"] is not None:
        words += f" {plural(facts['records'], 'record')} analysed"
        words += f", {_events(facts['events'])}." if facts["events"] is not None else "."
    return words


SENTENCES: dict[str, Sentence] = {
    **ANSWER,
    **METHODS,
    **CAUSE,
    "level": _level,
    # Headings
    "heading-answer": "The answer",
    "heading-contents": "In this report",
    "heading-crude-adjusted": "From crude to adjusted",
    "heading-by-exposure": "By exposure",
    "heading-counted": "Who was counted",
    "heading-characteristics": "Who they were",
    "heading-estimates": "The estimates",
    "heading-comparison": "The models side by side",
    "heading-reliance": "Can this be relied on?",
    "heading-methods": "How it was done",
    "heading-references": "References",
    "heading-cause": "Is this causal?",
    "heading-cautions": "Before you use this",
    "heading-provenance": "What it was made from",
    "heading-not-estimated": "Not estimated: {name}",
    "heading-partly-estimated": "Estimated in part: {name}",
    "heading-stops": "Read this first",
    "heading-warnings": "Keep in mind",
    "fold-warnings": "More to keep in mind",
    "heading-other-models": "The other models",
    "heading-further-checks": "Further checks",
    # Eyebrows and small labels
    "eyebrow": "Study report",
    "banner-internal": "INTERNAL. This copy shows every count. It is not for sharing outside the organisation.",
    "verdict-fine": "Fine",
    "verdict-look": "Look",
    "verdict-caution": "Caution",
    "verdict-not applicable": "Does not apply",
    "severity-note": "Note",
    "severity-caution": "Caution",
    "severity-stop": "Stop",
    "figure-number": "Figure {number}",
    "table-number": "Table {number}",
    "scrolls-sideways": "Table {number}: {title}",
    "cell-withheld": "withheld",
    "cell-no-limit": "no finite limit",
    "hidden-cells-note": (
        "“withheld” stands for a count under {below}, or for a number from which one could be worked out."
    ),
    "no-value-reason": "{label}: {reason}",
    # The estimates
    "column-exposure": "Contrast",
    "column-adjustment": "Adjustment column",
    "column-odds-ratio": "Odds ratio",
    "column-profile": "{level} interval, profile likelihood",
    "column-wald": "{level} interval, Wald",
    "column-p": "p-value, Wald",
    "column-term": "Term",
    "column-df": "Degrees of freedom",
    "column-likelihood-ratio": "Likelihood-ratio statistic",
    "column-term-p": "p-value",
    "table-exposure": "Adjusted odds ratios of the exposures",
    "table-exposure-unadjusted": "Odds ratios of the exposure, not adjusted",
    "table-adjustment": "Odds ratios of the adjustment columns",
    "terms-table": "Likelihood-ratio tests",
    "terms-note": (
        "Each line compares two models, one with the term and one without it; terms that contain it are in neither."
    ),
    "all exposure columns": "All exposure columns together",
    "whole model": "The whole model",
    "fold-adjustment": "Odds ratios of the adjustment columns",
    "fold-terms": "Tests of whole terms",
    "fold-crude-adjusted": "What adjustment changed, in numbers",
    "columns-not-shown": "Not shown, because their columns change together: {terms}.",
    "adjustment-caution": (
        "These odds ratios are not answers of their own. The columns were chosen to adjust the exposure, so each of "
        "these numbers may itself be confounded, or may lack the part that runs through the exposure (Westreich & "
        "Greenland, 2013). They are here so that the model can be checked."
    ),
    "lead-profile": (
        "The interval that leads, in pictures and in words, is the profile-likelihood interval; the Wald interval "
        "stands beside it."
    ),
    "lead-exact": (
        "The limits that lead are exact: each comes from a one-sided test of the conditional distribution, so that the "
        "interval covers at least as often as it says, and usually more often. The mid-P limits beside them do so on "
        "average only. Exact inference has neither a standard error nor Wald or profile limits."
    ),
    "lead-penalised": (
        "The interval that leads is the profile interval of the penalised likelihood; the Wald interval stands beside "
        "it."
    ),
    "lead-log-f": (
        "The interval that leads is the profile interval of the likelihood with its prior; the Wald interval stands "
        "beside it."
    ),
    "column-conditional": "Odds ratio, conditional maximum likelihood",
    "column-exact": "{level} exact interval",
    "column-mid-p": "{level} mid-P interval",
    "column-median-unbiased": "Odds ratio, median unbiased",
    "column-exact-p": "p-value, exact, twice the smaller tail",
    "column-mid-p-p": "p-value, mid-P",
    "table-exposure-exact": "Odds ratios of the exposures by exact conditional inference",
    "exact-note": "All other columns of the model are conditioned upon, and so are the numbers of events.",
    "lead-separated": (
        "The likelihood has no maximum. An odds ratio without a finite estimate shows the limit that the profile "
        "likelihood sets on one side, and no other number; the others come from the records that are not separated, "
        "with their profile interval and their Wald interval."
    ),
    "partly-estimated": "The likelihood of this model has no maximum, so some of its odds ratios have no estimate.",
    "by-method": "by {method}",
    "lead-wald": "The interval shown is the Wald interval, since this way of fitting has no likelihood to profile.",
    "p-caution": (
        "A p-value says how surprising the records would be if the odds ratio were exactly 1 and the model right. It "
        "measures neither the size of the odds ratio nor its importance."
    ),
    "same-records-caution": (
        "Odds ratios change when columns are added to a model even without any confounding, because odds ratios do "
        "not collapse over groups (Greenland, Robins & Pearl, 1999). A change is therefore no measure of confounding."
    ),
    "model-differs": _differs,
    "model-why": "Why it is here: {why}",
    "not-estimated": "The model could not be estimated ({status}), so no number of it is shown.",
    "model-formula": "Formula",
    "added-by-program": "Added by the program, not asked for in the plan.",
    # Checks
    "checks-lead": "What was looked at, each in one line. The detail is folded beneath its line.",
    "not-given": "Not given: {reason}",
    "checks-none": "No check of this model could be done.",
    "fold-certificate": "How exact the numbers are",
    "fold-notes": "Notes",
    "certificate": _certificate,
    # Provenance
    "records-fingerprint": _seen,
    "plan-fingerprint": "{plan}, fingerprint (SHA-256)",
    "fold-plan": "The plan, word for word",
    "versions": "Made with",
    "seed": "Seed of all random numbers",
    # Pictures
    "figure-lower-odds": "← lower odds",
    "figure-higher-odds": "higher odds →",
    "figure-records-read": "records read",
    "figure-records-analysed": "analysed",
    "figure-of-whom-events": lambda facts: _events(facts["events"]),
    "figure-withheld": "withheld",
    "figure-agreement": "full agreement",
    "figure-groups": "groups, with intervals",
    "figure-smooth": "smooth curve",
    "figure-observed-share": "Observed share",
    "figure-predicted-risk": "Predicted risk",
    "figure-area": "Area {area}",
    "figure-true-positive": "Share of those with the event above the cut",
    "figure-false-positive": "Share of those without it above the cut",
    "figure-curve": "curve, with its band",
    "figure-straight": "straight line",
    "figure-reference": "reference, {value}",
    "figure-odds-ratio-log": "Odds ratio (log scale)",
    "figure-reported": "as reported",
    "figure-unadjusted": "with no adjustment",
    "figure-choices": "Choices of adjustment columns, in the order of their odds ratios",
    "figure-share-of-group": "Share of the group",
    "figure-bins-withheld": "Bins whose count is withheld are left empty.",
}
