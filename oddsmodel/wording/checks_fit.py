"""Sentences of the checks of counting, fit and influence."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, decimal, p_value, plural, ratio
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]


def _share(share: float) -> str:
    """A share between 0 and 1 in whole per cent, so that no small count can be worked out from it."""
    if share <= 0.0:
        return "none"
    return "under 1%" if share < 0.01 else f"{100 * share:.0f}%"


def _points(gap: float) -> str:
    """A difference of two shares, in events per 100."""
    return "under 0.1 per 100" if gap < 0.001 else f"{decimal(100 * gap, 1)} per 100"


def _p(p: float) -> str:
    text = p_value(p)
    return f"p {text}" if text.startswith(("under", "over")) else f"p = {text}"


def _counting_line(facts: Facts) -> str:
    line = f"The model rests on {plural(facts['analysed_records'], 'record')}"
    share = facts["share"]
    if share is None:
        return f"{line}."
    left_out = _share(share)
    if share == 0:
        return f"{line}; none that belongs to the study had to be left out."
    line = f"{line}; {left_out} of those that belong to the study had to be left out"
    if share < 0.05:
        return f"{line}, a small part."
    return f"{line}: if what is not recorded goes with the outcome, the odds ratios are off by an unknown amount."


def _many_left_out(facts: Facts) -> str:
    return (
        f"{_share(facts['share'])} of the records that belong to the study were left out, because something was not "
        "recorded or a level is not in the plan. Compare the records left out with those analysed before relying on "
        "the odds ratios."
    )


def _hosmer_lemeshow_line(facts: Facts) -> str:
    result = f"Hosmer–Lemeshow, {facts['groups']} groups, {_p(facts['p'])}"
    if facts["p"] >= 0.05:
        line = f"Observed counts lie about as close to the fitted ones as chance allows ({result})"
        return f"{line}, though among so few records only gross misfit would show." if facts["few"] else f"{line}."
    return (
        f"Observed counts lie further from the fitted ones than chance readily explains ({result}): a curve or an "
        "interaction may be missing, so look at the table of groups and at the straight-line assumption."
    )


def _hosmer_lemeshow_too_many(facts: Facts) -> str:
    return (
        f"Above {count(facts['most'])} records a test of fit finds misfit too small to matter, so Hosmer–Lemeshow is "
        "left out; observed and expected counts in ten groups show how large any misfit is."
    )


def _hosmer_lemeshow_few_patterns(facts: Facts) -> str:
    return (
        f"The records have only {count(facts['distinct'])} distinct fitted probabilities for "
        f"{count(facts['groups'])} groups, so Hosmer–Lemeshow is left out (it needs {facts['least']} a group); the "
        "Pearson and deviance tests serve where each pattern's counts are large enough."
    )


def _residual_tests_line(facts: Facts) -> str:
    result = f"Pearson {_p(facts['pearson_p'])}, deviance {_p(facts['deviance_p'])}"
    patterns = f"{count(facts['patterns'])} covariate patterns"
    if min(facts["pearson_p"], facts["deviance_p"]) >= 0.05:
        return f"The counts of the {patterns} lie about as close to the fitted ones as chance allows ({result})."
    return (
        f"The counts of the {patterns} lie further from the fitted ones than chance readily explains ({result}): an "
        "interaction or a curve may be missing, or records that belong together may be counted as independent."
    )


def _residual_tests_small(facts: Facts) -> str:
    return (
        f"The {count(facts['patterns'])} covariate patterns hold too few records each for the Pearson and deviance "
        "tests, which need at least 5 expected records of either outcome in four of five patterns and 1 in all."
    )


def _calibration_line(facts: Facts) -> str:
    level = f"{round(100 * facts['level'], 1):g}%"
    groups, outside = facts["groups"], facts["groups_outside"]
    line = (
        f"In {plural(groups, 'group')} of fitted probability, the observed share lies {_points(facts['mean_gap'])} "
        f"from the fitted one on average, {_points(facts['largest_gap'])} at most"
    )
    if facts["looks"]:
        return f"{line}; {outside} of the {level} intervals leave the fitted share out, so the shape is worth a look."
    return f"{line}; {groups - outside} of the {level} intervals hold the fitted share, so no departure shows."


def _calibration_departs(facts: Facts) -> str:
    return (
        f"Observed and fitted shares differ by {_points(facts['mean_gap'])} on average over "
        f"{plural(facts['groups'], 'group')} of fitted probability, and {facts['groups_outside']} intervals leave the "
        "fitted share out. A curve or an interaction may be missing from the formula."
    )


def _no_risk(what: str) -> Sentence:
    return (
        f"{what} compares fitted with actual risks; a {{design}} study fixes the share of cases by its sampling and "
        "has no such risks, so it is left out."
    )


def _roc_no_overlap(facts: Facts) -> str:
    return (
        f"No interval: the area is {facts['area']:.0f}, every record with the event on one side of every one without, "
        "and the standard error is then 0 whatever the number of records."
    )


def _unit(facts: Facts) -> str:
    """What is left out one by one: covariate patterns, or rows where these are too many."""
    return "row" if facts.get("single") else "covariate pattern"


def _short(facts: Facts) -> str:
    return _unit(facts).split()[-1]


def _patterns(facts: Facts) -> str:
    number = facts["patterns"]
    return f"the {_unit(facts)}" if number == 1 else f"the {number} {_unit(facts)}s"


def _moves(facts: Facts) -> str:
    """What leaving out does: to the odds ratio, or in standard errors where there is no odds ratio of its own."""
    if not facts["exposure"]:
        whose = "the exposure's coefficients" if facts["exposed"] else "the model's coefficients"
        return f"moves {whose} by at most {decimal(facts['shift'])} standard errors"
    before, after = ratio(facts["before"]), ratio(facts["after"])
    change = (
        f"leaves the odds ratio at {before}" if before == after else f"moves the odds ratio from {before} to {after}"
    )
    return f"{change} ({facts['exposure']})"


def _influence_little(facts: Facts) -> str:
    return f"Leaving out {_patterns(facts)} with most influence {_moves(facts)}: no more than that usually does."


def _influence_much(facts: Facts) -> str:
    return (
        f"Leaving out {_patterns(facts)} with most influence {_moves(facts)}: check those records for "
        "mistakes, and report the result with and without them."
    )


def _influence_coarse(facts: Facts) -> str:
    return (
        f"The records fall into a few large covariate patterns. Leaving out the one with most influence "
        f"{_moves(facts)}; so large a part of the records may well do that."
    )


def _influence_alt(facts: Facts) -> str:
    number = count(facts["patterns"])
    which = f"{count(facts['drawn'])} of {number} {_unit(facts)}s" if facts["sampled"] else f"{number} {_short(facts)}s"
    extra = ", those with most influence and a random sample of the others" if facts["sampled"] else ""
    return (
        f"Fall in deviance without a {_short(facts)} against its fitted probability, for {which}{extra}. "
        "Larger marks move the coefficients more."
    )


def _influence_explanation(facts: Facts) -> str:
    short, what = _short(facts), "Records with equal values of all columns form a covariate pattern."
    if facts["single"]:
        what = f"The records have more than {count(facts['most'])} covariate patterns and are taken row by row."
    return (
        f"{what} Leverage, the falls in Pearson chi-square and deviance, and the shift of the coefficients without a "
        f"{short} are taken to one step of the fit (Pregibon, 1981); {short}s are put in order by how far the "
        f"exposure's coefficients shift. The odds ratios without the 1, 5 and 10 {short}s of most influence are exact: "
        "the model is fitted again. Leaving out the records of most influence always moves an estimate: ten of a "
        "thousand ordinary records by half a standard error to two, the more the fewer events the exposed have. It is "
        f"a caution where one {short} (at most 5% of the records) moves a coefficient by a standard error, or k "
        f"{short}s (at most 2%) by the square root of k standard errors, and the odds ratio by 10%; worth a look from "
        "three quarters of that on. Odd records are to be checked for mistakes, not left out because they are odd."
    )


FIT_SENTENCES: dict[str, Sentence] = {
    "counting-title": "Records left out",
    "counting-line": _counting_line,
    "counting-no-flow": "The model was given its records ready made, so nothing is known of records left out.",
    "counting-many-left-out": _many_left_out,
    "counting-explanation": (
        "Records are left out where the outcome, the exposure or an adjustment column is not recorded, or where a "
        "level is not in the plan. The share is of the records that belong to the study; those that the plan's own "
        "condition excludes are not counted. From 5% on it is worth a look, from 20% on a caution."
    ),
    "hosmer-lemeshow-title": "Observed against expected counts (Hosmer–Lemeshow)",
    "hosmer-lemeshow-line": _hosmer_lemeshow_line,
    "hosmer-lemeshow-misfit": _hosmer_lemeshow_line,
    "hosmer-lemeshow-too-many-records": _hosmer_lemeshow_too_many,
    "hosmer-lemeshow-few-groups": lambda facts: (
        f"Equal fitted probabilities leave only {plural(facts['groups'], 'group')}, and with fewer than "
        f"{facts['fewest']} the Hosmer–Lemeshow test would find hardly any misfit; it is left out."
    ),
    "hosmer-lemeshow-few-patterns": _hosmer_lemeshow_few_patterns,
    "hosmer-lemeshow-small-expected": (
        "Some of the {groups} groups expect too few records of either outcome for the Hosmer–Lemeshow statistic to "
        "follow a chi-square distribution; the test is left out, and the table of groups serves as a description."
    ),
    "hosmer-lemeshow-no-intercept": (
        "The formula has no intercept, so expected and observed totals differ and the Hosmer–Lemeshow test does not "
        "apply."
    ),
    "hosmer-lemeshow-explanation": (
        "Records are put in order of their fitted probability and cut into groups of about equal size; records with "
        "equal fitted probabilities are never split. Observed and expected counts are compared by a chi-square "
        "statistic with two degrees of freedom fewer than there are groups (Hosmer & Lemeshow, 1980). Up to 1\u202f000 "
        "records there are 10 groups; from there on their number grows so that the test's power does not "
        "(Paul, Pennell & Lemeshow, 2013), and above 25\u202f000 records it is left out. It is also left out with "
        "fewer than 6 groups; with fewer than 5 distinct fitted probabilities a group, unless 80% of the records have "
        "one of their own; and where the groups' expected counts give the statistic less than half or more than twice "
        "the variance of a chi-square. The table always shows ten groups. A high p does not show that the model is "
        "right, and no p says how an odds ratio would change."
    ),
    "residual-tests-title": "Covariate patterns against the model (Pearson and deviance)",
    "residual-tests-line": _residual_tests_line,
    "residual-tests-misfit": _residual_tests_line,
    "residual-tests-small-expected": _residual_tests_small,
    "residual-tests-uncounted": lambda facts: (
        f"The records have more than {count(facts['most'])} covariate patterns, which are not counted one by one, so "
        "the Pearson and deviance tests are left out."
    ),
    "residual-tests-saturated": (
        "The model has as many coefficients as there are covariate patterns and fits each of them exactly: nothing "
        "is left to test."
    ),
    "residual-tests-explanation": (
        "Records with equal values of all columns form a covariate pattern. The Pearson chi-square and the deviance "
        "compare each pattern's count of events with the fitted one; their degrees of freedom are patterns minus "
        "coefficients (McCullagh & Nelder, 1989). The p-values are shown only where expected records with and without "
        "the event are at least 5 in four of five patterns and at least 1 in all (Cochran, 1954): with a pattern for "
        "nearly every record the statistics say nothing about fit."
    ),
    "calibration-title": "Observed share against fitted probability",
    "calibration-line": _calibration_line,
    "calibration-departs": _calibration_departs,
    "calibration-no-risk": _no_risk("Calibration"),
    "calibration-alt": lambda facts: (
        f"Observed share of events against mean fitted probability in {plural(facts['groups'], 'group')}, with "
        "intervals, a smooth curve where there are records enough, and the line of perfect agreement."
    ),
    "calibration-explanation": (
        "Groups are tenths of the fitted probability (equal probabilities stay together), each with its observed "
        "share and Wilson's interval. The curve is a local straight line over the nearest 75% of the records "
        "(Cleveland, 1979), drawn between the first and the last hundredth of the records. This describes the "
        "records that the model was fitted to, whose overall level and slope agree by construction; it does not say "
        "how well the model would do elsewhere. It is called worth a look where at least three intervals leave out "
        "the fitted share and the mean gap is above a tenth of the share of the rarer outcome."
    ),
    "roc-title": "How well the fitted probabilities tell the outcomes apart (ROC curve)",
    "roc-alt": lambda facts: (
        "Receiver operating characteristic curve: share of events found against share of false alarms. Area "
        f"{decimal(facts['area'])}."
    ),
    "roc-one-outcome": "All records have the same outcome, so there are no pairs to compare.",
    "roc-one-record": "No interval: it needs at least two records with the event and two without.",
    "roc-no-overlap": _roc_no_overlap,
    "roc-no-spread": "No interval: all records that count have the same place among the fitted probabilities.",
    "roc-classes": lambda facts: (
        f"The records were counted in {count(facts['classes'])} classes of the fitted probability; the area is right "
        f"to within {facts['bound']:.1g}."
    ),
    "roc-explanation": (
        "The area is the share of pairs, a record with the event beside a record without it, in which the former has "
        "the higher fitted probability; ties count one half. The standard error is that of DeLong, DeLong & "
        "Clarke-Pearson (1988), the interval on the logit scale. Measured on the records that the model was fitted "
        "to, the area flatters. It does not say whether the model fits, nor whether an odds ratio is right: for a "
        "question of association it is a description only."
    ),
    "brier-title": "Brier score",
    "brier-no-risk": _no_risk("The Brier score"),
    "brier-one-outcome": "All records have the same outcome, so there is nothing to scale the score by.",
    "brier-explanation": (
        "The mean squared distance between outcome (1 or 0) and fitted probability (Brier, 1950); 0 is best. Beside it "
        "stands the score of giving every record the overall share of events; the scaled score is the part of that "
        "which the model takes away (Steyerberg et al., 2010). Measured on the records that the model was fitted to, "
        "it flatters."
    ),
    "influence-title": lambda facts: f"Influence of single {_unit(facts)}s",
    "influence-one-by-one": lambda facts: (
        f"The records have more than {count(facts['most'])} covariate patterns, which are not counted; they are taken "
        "row by row."
    ),
    "influence-little": _influence_little,
    "influence-coarse": _influence_coarse,
    "influence-coarse-carried": (
        "The records fall into a few large covariate patterns, and without the one with most influence there is no "
        "estimate of the exposure's odds ratio."
    ),
    "few-patterns-move-the-exposure": _influence_much,
    "few-patterns-carry-the-exposure": lambda facts: (
        f"Without {_patterns(facts)} with most influence there is no usable estimate of the "
        "exposure's odds ratio: few records decide it."
    ),
    "influence-no-columns": "The model has no column besides the intercept that a record could influence.",
    "influence-saturated": (
        "The model has as many coefficients as there are covariate patterns: each pattern fixes a coefficient, and "
        "none can be left out."
    ),
    "influence-no-odds-ratio": "No column of the exposure has an odds ratio of its own.",
    "influence-no-estimate": (
        "Without these records the exposure's odds ratio has no finite estimate, or one beyond a million."
    ),
    "influence-deletions-title": lambda facts: (
        f"The exposure's odds ratio without the {_short(facts)}s of most influence"
    ),
    "influence-patterns-title": lambda facts: (
        f"{_unit(facts).capitalize()}s that move the exposure's coefficients most"
    ),
    "influence-left-out": lambda facts: f"{_unit(facts).capitalize()}s left out",
    "influence-several-values": "several values",
    "influence-fall": lambda facts: f"Fall in deviance without the {_short(facts)}",
    "influence-one-step-heading": "Odds ratio without it, to one step: {label}",
    "influence-alone": lambda facts: (
        f"A {_short(facts)} whose leverage is 1 fixes a coefficient by itself; the rest of its row is empty."
    ),
    "influence-axis": "Fitted probability",
    "influence-axis-cases": "Fitted probability of being a case among these records",
    "influence-alt": _influence_alt,
    "influence-explanation": _influence_explanation,
}
