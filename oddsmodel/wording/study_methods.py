"""Sentences on methods other than maximum likelihood, and on what maximum likelihood leaves without an answer."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from oddsmodel.wording.numbers import count, listed, plural, ratio
from oddsmodel.wording.say import Sentence

METHOD_WORDS: dict[str, str] = {
    "maximum likelihood": "maximum likelihood",
    "penalised": "penalised likelihood",
    "log-F": "maximum likelihood with log-F priors",
    "exact": "exact conditional inference",
}
"""How each method of a plan is told."""


def prior_words(m: float, labels: Sequence[str]) -> str:
    """A prior in a few words."""
    return f"a log-F({m:g}, {m:g}) prior for the odds ratio of {listed(list(labels))}"


def _no_finite_estimate(facts: Mapping[str, Any]) -> str:
    side = "above" if facts["above"] else "below"
    if facts["limit"] is None:
        return f"No finite estimate: the likelihood rises without end as the odds ratio moves {side} any bound."
    return (
        f"No finite estimate: at or {side} {facts['limit']}, by the limit of the profile likelihood on the one "
        "side where it has one."
    )


def _beyond_budget(facts: Mapping[str, Any]) -> str:
    budget = facts["budget"]
    allowed = f"{budget / 1e9:g} GB of memory" if facts["limit"] == "bytes" else f"{count(budget)} of them"
    sums = f"{count(facts['states'])} partial sums"
    did = f"had worked out {sums} in all" if facts["limit"] == "work" else f"would have had to hold {sums} at once"
    return (
        f"Exact inference was given up: after {count(facts['done'])} of "
        f"{plural(facts['patterns'], 'covariate pattern')} it {did}, more than its budget of {allowed}. So many "
        "records, or so many different values, hardly need exact limits: use the method penalised, or cut number "
        "columns into bands."
    )


def _sparse(facts: Mapping[str, Any]) -> str:
    return (
        f"{facts['label']}: the odds ratio is {ratio(facts['plain'])} by maximum likelihood and "
        f"{ratio(facts['penalised'])} by penalised likelihood, which takes the first-order bias away: with few "
        "events for each coefficient, estimates by maximum likelihood lie too far from 1 on average (Greenland, "
        "Mansournia & Altman 2016)."
    )


def _disagree(facts: Mapping[str, Any]) -> str:
    return (
        f"{facts['label']}: the profile-likelihood interval and the Wald interval disagree noticeably. The Wald "
        "interval rests on a symmetric likelihood, which this is not: go by the profile interval."
    )


def _prior(facts: Mapping[str, Any]) -> str:
    return (
        f"A log-F({facts['m']:g}, {facts['m']:g}) prior stands behind the odds ratio of {listed(facts['labels'])}: it "
        f"holds odds ratios from {ratio(facts['lower'])} to {ratio(facts['upper'])} to be 95% probable before "
        "the records are seen, with 1 in the middle. The estimates lie nearer to 1 for it "
        "(Greenland & Mansournia 2015)."
    )


SENTENCES: dict[str, Sentence] = {
    "no-finite-estimate": _no_finite_estimate,
    "profile-is-flat": "No estimate: the profile likelihood is flat, so the records say nothing of this odds ratio.",
    "finite-part-not-settled": "Not estimated: the fit on the records that are not separated did not settle.",
    "exact-has-its-own-limits": "Exact inference has limits of its own, and neither a standard error nor a likelihood "
    "to profile.",
    "exact-conditioned-upon": "Conditioned upon: exact inference for the exposure takes this coefficient out "
    "altogether.",
    "exact-plus-infinity": "No finite estimate: the exposed had as many events as the other columns allow. The "
    "median-unbiased estimate is finite, and the lower limit stands.",
    "exact-minus-infinity": "No finite estimate: the exposed had as few events as the other columns allow. The "
    "median-unbiased estimate is finite, and the upper limit stands.",
    "exact-no-information": "No information: given the other columns, the records leave only one possible outcome for "
    "the exposed.",
    "exact-beyond-budget": _beyond_budget,
    "exact-many-values": "Exact inference says nothing here: {label} takes so many different values that only the "
    "records as they are have its sum. Cut it into bands, or use the method penalised.",
    "penalised-added": "Maximum likelihood has no finite answer, so a model by penalised likelihood was added beside "
    "it, on the same records with the same formula: “{name}”.",
    "differs-penalised": "By penalised likelihood instead of maximum likelihood",
    "penalised-name": "{name}, by penalised likelihood",
    "penalised-second-maximum": "The penalised likelihood has a second, lower maximum: its interval may not tell all "
    "values that fit the records.",
    "no-certificate-of-method": "Digits are certified for maximum likelihood, with or without a prior, and not for "
    "this method.",
    "checks-of-method": "Checks that rest on the fit by maximum likelihood (goodness of fit, functional form, "
    "influence) were not made, because this model was not fitted by maximum likelihood alone.",
    "no-certificate-without-maximum": "Where the likelihood has no maximum, no digits are certified.",
    "separated-no-tests": "The likelihood of this model has no maximum, so trends and averages are not given.",
    "average-without-contrast": "{label}: the levels stand against the reference, not against their average. {reason}",
    "exact-no-tests": "Exact inference gives limits and p-values for each coefficient of the exposure, and neither "
    "trends nor averages of levels.",
    "exact-no-likelihood": "Exact inference has no log-likelihood of the whole model.",
    "sparse-data-bias": _sparse,
    "sparse-data-bias-withheld": "With few events for each coefficient, estimates by maximum likelihood lie too far "
    "from 1 on average (Greenland, Mansournia & Altman 2016), and here an odds ratio by penalised likelihood is "
    "noticeably nearer to it.",
    "limits-disagree": _disagree,
    "wald-fails": "{label}: the odds ratio is so far from 1 that its Wald statistic no longer grows with it (Hauck & "
    "Donner 1977), and the Wald p-value is too large. Go by the likelihood-ratio test and the profile interval.",
    "prior-in-words": _prior,
    "corrected-intercept-table": "Intercepts for predicted risks",
    "corrected-intercept-note": "Penalised likelihood pulls predicted risks towards one half on average. With the "
    "corrected intercept their average is the share observed (Puhr et al. 2017).",
}
