"""Sentences of the further tests of fit and of the half-normal plot."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, decimal, p_value, plural
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]

NAMES = {
    "hosmer_lemeshow": "Hosmer–Lemeshow",
    "standardised_pearson": "Standardised Pearson (Osius–Rojek)",
    "unweighted_squares": "Unweighted sum of squares (Copas)",
    "stukel": "Stukel",
    "link_test": "Link (Pregibon)",
    "information_matrix": "Information matrix (White)",
}
LOOKS_FOR = {
    "hosmer_lemeshow": "counts that are off in groups of the fitted probability",
    "standardised_pearson": "outcomes that surprise too much, or too little, for their fitted probability",
    "unweighted_squares": "fitted probabilities that are too bold or not bold enough",
    "stukel": "a tail of the risk curve that is too long or too short",
    "link_test": "log odds that are bent against the fitted ones",
    "information_matrix": "columns that do not act alike on all records: a missing curve or interaction",
}


def _p(p: float) -> str:
    text = p_value(p)
    return f"p {text}" if text.startswith(("under", "over")) else f"p = {text}"


def _points(gap: float) -> str:
    """A difference of two shares, in percentage points."""
    if gap < 0.0005:
        return "under 0.1 percentage points"
    return f"{decimal(100 * gap, 1)} percentage points"


def _shift(shift: float, absolute: bool) -> str:
    """What a misfit does to the fitted probabilities, or to the odds where there are no risks."""
    if absolute:
        return f"shifts the fitted probabilities by {_points(shift)} on average"
    return f"shifts the fitted odds by a factor of {decimal(shift)} on average"


def _tenths(facts: Facts) -> str:
    """How far apart observed and fitted are over tenths."""
    if facts["absolute"]:
        gaps = f"{_points(facts['mean_gap'])} on average and {_points(facts['largest_gap'])} at most"
        return f"observed and fitted shares differ by {gaps} over tenths of the fitted probability"
    apart = facts["apart"]
    share = "under 1%" if apart < 0.01 else f"{100 * apart:.0f}%"
    return f"the differences of observed and expected cases, over tenths, add up to {share} of the rarer outcome"


def _none_found(facts: Facts) -> str:
    number, p = facts["tests"], _p(facts["p"])
    line = (
        f"The one test of fit that applies finds no more misfit than chance allows ({p})"
        if number == 1
        else f"None of {number} tests of fit finds more misfit than chance allows (smallest {p}, with {number} tests "
        "allowed for)"
    )
    if facts["found"] is None:
        return f"{line}."
    shift, kind = _shift(facts["found"], facts["absolute"]), "its kind" if number == 1 else "their kinds"
    return f"{line}; a misfit of {kind} that {shift} would mostly be found, a smaller one often not."


def _some_found(facts: Facts) -> str:
    number, p, name = facts["tests"], _p(facts["p"]), NAMES[facts["smallest"]]
    allowed = p if number == 1 else f"{p}, with {number} tests allowed for"
    size = _tenths(facts)
    if facts["shift"] is not None:
        size = f"what it sees {_shift(facts['shift'], facts['absolute'])}, and {size}"
    if facts["many"]:
        end = "which is small" if facts["small"] else "which is not small: a curve or an interaction may be missing"
        return (
            f"Among {plural(facts['analysed_records'], 'record')} tests find even misfit that does not matter, here "
            f"{name} ({allowed}), so its size decides: {size}, {end}."
        )
    end = "which is small" if facts["small"] else "so that a curve or an interaction may be missing"
    whose = "the one test of fit that applies" if number == 1 else f"of {number} tests of fit the one that objects most"
    return (
        f"{name}, {whose}, looks for {LOOKS_FOR[facts['smallest']]} and finds more than chance readily explains "
        f"({allowed}): {size}, {end}."
    )


def _line(facts: Facts) -> str:
    return _none_found(facts) if facts["p"] >= 0.05 else _some_found(facts)


def _explanation(facts: Facts) -> str:
    rows = (
        "The records have too many covariate patterns to count them one by one, so the Pearson statistic is taken over "
        "records."
        if facts["single"]
        else "The Pearson statistic is taken over covariate patterns, records with equal values of all columns."
    )
    cases = (
        " In a case-control study the fitted probabilities are those of being a case among these records; the tests "
        "compare them with which of these records are cases, so that none of them rests on the intercept, and none "
        "says anything of risks."
        if facts["cases"]
        else ""
    )
    return (
        "Each test looks for another kind of misfit; the table says which. All compare a sum over the records with the "
        "mean and the variance that it has where the model holds; the variance is what a weighted regression on the "
        "model's columns leaves over. Standardised Pearson: Osius & Rojek (1992), its mean taken to the second order, "
        "without which it rejects good models of single records. Unweighted squares: Copas (1989); Hosmer, Hosmer, le "
        "Cessie & Lemeshow (1997). Stukel (1988): a tail that only few records reach is left out. Link: Pregibon "
        "(1980). Information matrix: White (1982), its diagonal only, with the variance of Orme (1988) for binary "
        f"outcomes, the form that keeps its level. {rows}{cases}\n"
        "The sentence takes the smallest p times the number of tests (Holm, 1979). Few records let only gross misfit "
        "be found, very many let any be found. So it says what misfit would be found four times in five, and where one "
        "is found how large it is: the average shift along what the test looks for that its statistic can stand for at "
        "most, with what chance adds taken away. A test sees no other part of a misfit. It is small where it moves "
        "fewer records than 5% of those with the rarer outcome; above 25\u202f000 records misfit that is small, by the "
        "test and over tenths, is no reason to look further. Misfit in opposite directions within a tenth does not "
        "show over tenths.\n"
        "A test is left out with fewer than 4 records of the rarer outcome for each coefficient and added column; "
        "where its sum rests on a few records with probabilities near 0 or 1 (an excess kurtosis above 2), so that a "
        "chi-square distribution is not to be trusted; and, for Pearson, with fewer than 20 patterns more than "
        "coefficients. A high p does not show that the model is right."
    )


def _half_normal_line(facts: Facts) -> str:
    result = f"{facts['simulations']} simulations of the model, {_p(facts['p'])}"
    if facts["p"] > 0.05:
        return f"The ordered deviance residuals stay among those that the model itself gives ({result})."
    side = "larger" if facts["above"] else "smaller"
    return (
        f"The ordered deviance residuals leave those that the model itself gives ({result}), where they differ most by "
        f"being {side}: look for records that are mistaken, for records that belong together, and for a missing column."
    )


SENTENCES: dict[str, Sentence] = {
    "goodness-title": "Further tests of fit, weighed together",
    "goodness-line": _line,
    "goodness-explanation": _explanation,
    "goodness-table": "Tests of fit and what each looks for",
    "goodness-note": (
        "The likelihood ratios stand beside their score tests and are not counted again. A test without numbers was "
        "left out; why stands below, and for Hosmer–Lemeshow with the check of that name."
    ),
    "goodness-heading-test": "Test",
    "goodness-heading-looks-for": "What it looks for",
    "goodness-heading-statistic": "Chi-square",
    "goodness-heading-df": "Degrees of freedom",
    "goodness-heading-p": "p-value",
    "goodness-heading-shift": lambda facts: (
        "Average shift of the fitted probabilities, percentage points"
        if facts["absolute"]
        else "Average shift of the fitted odds, as a factor"
    ),
    **{f"goodness-{name}": words for name, words in NAMES.items()},
    **{f"goodness-{name}-looks-for": words for name, words in LOOKS_FOR.items()},
    "goodness-stukel-ratio": "Stukel, by likelihood ratio",
    "goodness-link_test-ratio": "Link, by likelihood ratio",
    "goodness-ratio": "the same",
    "goodness-no-test": "No test of fit applies to these records and this model.",
    "goodness-no-risk": (
        "A {design} study fixes the share of cases by its sampling and has no risks that observed shares could be "
        "compared with."
    ),
    "goodness-matched": (
        "Matched sets are compared within themselves: the model has no fitted probabilities that outcomes could be "
        "compared with, so the tests of fit are left out."
    ),
    "goodness-edge": (
        "The sum that is tested rests on a few records with fitted probabilities near 0 or 1, so that its distribution "
        "is not known well enough for a p-value."
    ),
    "goodness-nothing-left": (
        "The model's own columns already hold what the test would add, as where every covariate pattern has its own "
        "coefficient: nothing is left to test."
    ),
    "goodness-few-events": (
        "There are fewer than {least} records of the rarer outcome for each coefficient and added column, too few for "
        "the test to keep its level."
    ),
    "goodness-few-patterns": lambda facts: (
        f"There are only {count(facts['patterns'])} covariate patterns, fewer than {facts['fewest']} more than "
        "coefficients, so the sum over them is not near normal; the Pearson and deviance tests serve where each "
        "pattern's counts are large enough."
    ),
    "goodness-beyond-telling": "So few records would hardly show any misfit.",
    "goodness-no-fit": "The model with the added columns could not be fitted.",
    "half-normal-title": "Half-normal plot of deviance residuals",
    "half-normal-line": _half_normal_line,
    "half-normal-explanation": (
        "The absolute deviance residuals of covariate patterns, in order, against the order that the half of a normal "
        "distribution would give; with the smallest, mean and largest values of residuals in the same order when "
        "outcomes are drawn from the fitted probabilities and the model is fitted to them again (Atkinson, 1981). The "
        "residuals need not be normal: only whether they leave the envelope counts. As every one of the points could "
        "leave it by chance, the p-value compares the largest standardised distance from the mean anywhere with that "
        "of the simulations (Myllymäki et al., 2017). With a pattern for nearly every record residuals depend on "
        "little but the fitted probabilities, and the plot then finds outliers and hardly any other misfit."
    ),
    "half-normal-axis-expected": "Expected order of the half-normal distribution",
    "half-normal-axis-observed": "Absolute deviance residual",
    "figure-envelope-observed": "observed",
    "figure-envelope-mean": "simulations: mean, smallest and largest",
    "half-normal-alt": lambda facts: (
        f"Absolute deviance residuals of {plural(facts['patterns'], 'covariate pattern')} in order, with an envelope "
        f"of {facts['simulations']} simulations of the model."
    ),
    "half-normal-many-rows": lambda facts: (
        f"The model would have to be fitted to {facts['simulations']} simulated sets of outcomes of "
        f"{count(facts['rows'])} patterns or rows, which is done up to {count(facts['most'])}; so many residuals "
        "hardly say more than the observed and expected counts do."
    ),
    "half-normal-few-patterns": lambda facts: (
        f"The {plural(facts['patterns'], 'covariate pattern')} leave fewer than {facts['fewest']} residuals beyond the "
        "coefficients: no order can be seen in so few."
    ),
    "half-normal-few-fits": lambda facts: (
        f"Only {facts['fitted']} of {facts['simulations']} simulated sets of outcomes could be fitted, the others "
        "being separated: too few for an envelope."
    ),
}
