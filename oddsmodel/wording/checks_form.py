"""Sentences of the checks of form: collinearity, straight lines, sparsity, overlap and independence."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, decimal, listed, p_value, plural, ratio
from oddsmodel.wording.say import Sentence

MOST_NAMED = 5


def _named(labels: list[str]) -> str:
    """A list of at most five labels, and how many more there are."""
    if len(labels) <= MOST_NAMED:
        return listed(labels)
    return f"{', '.join(labels[:MOST_NAMED])} and {plural(len(labels) - MOST_NAMED, 'more', 'more')}"


def _moves(facts: Mapping[str, Any]) -> str:
    """What doing otherwise does to the exposure's odds ratio; empty where the exposure has none of its own."""
    if facts["exposure"] is None:
        return ""
    before, after = ratio(facts["before"]), ratio(facts["after"])
    change = f"stays at {before}" if before == after else f"moves from {before} to {after}"
    return f"the odds ratio of {facts['exposure']} {change}"


def _whole_percent(share: float) -> str:
    if share < 0.005:
        return "under 1%"
    return "over 99%" if share > 0.995 else f"{100 * share:.0f}%"


def _part(share: float) -> str:
    """A rounded share of the records; 0 stands for a few of them, 1 for nearly all."""
    if share <= 0.0:
        return "a few"
    return "nearly all" if share >= 1.0 else f"{100 * share:.0f}%"


def _factor(value: float | None) -> str:
    return "more than can be told" if value is None else f"a factor of {ratio(value)}"


def _collinearity_line(facts: Mapping[str, Any]) -> str:
    tied, exposure, factor = facts["adjustment"], facts["exposure"], facts["factor"]
    if factor is None:
        return (
            f"{exposure} is all but a combination of the other columns: the records can hardly tell "
            "its odds ratio from theirs."
        )
    if factor >= 2.0:
        return (
            f"{exposure} goes closely with the adjustment columns: its standard error is about {decimal(factor, 1)} "
            "times what it would be if they were unrelated, and its interval wider to match."
        )
    line = f"Overlap with the other columns widens the standard error of {exposure} only {decimal(factor, 2)} times."
    if not tied:
        return line
    return (
        f"{line} {_named(tied)} can hardly be told apart from the rest of the adjustment; "
        "this blurs their own odds ratios, not the exposure's."
    )


def _linearity_line(facts: Mapping[str, Any]) -> str:
    looked_at, bent, doubtful = facts["looked_at"], facts["bent"], facts["doubtful"]
    if not facts["lines"]:
        return "No number enters the model as a straight line, so there is no straight line to doubt."
    if not looked_at:
        return "No curve could be set against the straight lines of the model: the reasons stand with this check."
    moves = _moves(facts)
    otherwise = "a curve" if len(looked_at) == 1 else "curves for all of them"
    if not bent:
        line = f"The records show no clear bend in the straight {_lines(looked_at)} of {_named(looked_at)}"
        if doubtful:
            line += f", though they are too few to rule out a large one for {_named(doubtful)}"
    else:
        sizes = [f"{label} (by up to {_factor(departure)} in the odds)" for label, departure in bent]
        line = f"A curve fits better than the straight {_lines(bent)} of {_named(sizes)}"
    return f"{line}; with {otherwise}, {moves}." if moves else f"{line}."


def _lines(of: list[Any]) -> str:
    return "line" if len(of) == 1 else "lines"


def _not_straight(facts: Mapping[str, Any]) -> str:
    message = (
        f"A curve fits better than the straight line of {facts['column']} (p {_p(facts['p'])}): over the middle 90% "
        f"of the records the odds by the curve and by the line differ by up to {_factor(facts['departure'])}."
    )
    if facts["of_exposure"]:
        return f"{message} Its one odds ratio is an average over its range; see the curve, and consider a spline."
    moves = _moves(facts)
    return f"{message} With the curve, {moves}." if moves else message


def _p(p: float) -> str:
    words = p_value(p)
    return words if words.startswith(("under", "over")) else f"= {words}"


def _linearity_explanation(facts: Mapping[str, Any]) -> str:
    text = (
        "Each number that enters as a straight line, in itself or as its log, is given a restricted cubic spline "
        "(four knots at the 5th, 35th, 65th and 95th centile, three where the values are few or pile up) in place of "
        "the line, and the two are compared by a likelihood-ratio test (Durrleman & Simon, 1989; Harrell, 2015). "
        "With many records the smallest bend is found, so the size of the bend and what it does to the exposure's "
        "odds ratio say whether it matters, not the p-value. The size is the largest ratio between the odds by the "
        "curve and by the line over the middle 90% of the records, both set to one at the median."
    )
    if facts["tests"] > 1:
        text += (
            f" {plural(facts['tests'], 'curve')} were looked at; one in twenty would have p below 0.05 by chance, "
            "so a bend is called seen only when its p times the number of curves is below 0.05."
        )
    for label, reason in facts["withheld"]:
        text += f" {label} {reason}"
    return text


def _sparse_line(facts: Mapping[str, Any]) -> str:
    exposure, adjustment, few = facts["exposure"], facts["adjustment"], facts["few"]
    if not facts["levels"]:
        return "The model has no category columns, so no level can be short of records."
    if exposure:
        return (
            f"Few events, or few records without one, stand behind {_named(exposure)}: the exposure's odds ratio and "
            "its limits rest on a handful of records there."
        )
    if adjustment:
        return (
            f"Few events, or few records without one, stand behind {_named(adjustment)} among the adjustment columns; "
            "the levels of the exposure have enough."
        )
    return f"Every level of every category column has at least {few} events and at least {few} records without one."


def _events_line(ending: str) -> Sentence:
    def line(facts: Mapping[str, Any]) -> str:
        rarer = "events" if facts["rarer_is_the_event"] else "records without the event"
        number = facts["ratio"]
        shown = count(round(number)) if number >= 10.0 else decimal(number, 1)
        return (
            f"There are {shown} {rarer} for each of the {plural(facts['parameters'], 'coefficient')}{ending}"
            if facts["parameters"] > 1
            else f"There are {shown} {rarer} for the one coefficient{ending}"
        )

    return line


def _overlap_line(facts: Mapping[str, Any]) -> str:
    if not facts["any_outside"]:
        return (
            f"The groups overlap: no record of {facts['group']} or {facts['other']} is beyond comparison with the "
            "other group across the adjustment columns."
        )
    line = (
        f"For {_part(facts['share'])} of the records of {facts['group']} or {facts['other']}, the adjustment columns "
        "all but settle which of the two they are in"
    )
    if facts["alone"]:
        line += ", for some of them entirely"
    moves = _moves(facts)
    return f"{line}; without such records, {moves}." if moves else f"{line}."


FORM_SENTENCES: dict[str, Sentence] = {
    "form-heading-column": "Column",
    "form-heading-level": "Level",
    "form-heading-records": "Records",
    "form-heading-events": "Events",
    "form-heading-part": "Part of the model",
    "form-heading-coefficients": "Coefficients",
    "form-heading-inflation": "Variance inflation",
    "form-heading-standard-error-factor": "Standard error wider by a factor of",
    "form-heading-likelihood-ratio": "Likelihood ratio",
    "form-heading-degrees-of-freedom": "Degrees of freedom",
    "form-heading-p": "p-value",
    "form-heading-departure": "Curve against line, largest ratio of the odds",
    "form-heading-exposure-with-line": "Exposure's odds ratio with the line",
    "form-heading-exposure-with-curve": "Exposure's odds ratio with the curve",
    "form-heading-exposure": "Exposure",
    "form-heading-against": "Against",
    "form-heading-outside": "Outside the overlap",
    "form-heading-share": "Share outside",
    "collinearity-title": "Can the columns be told apart?",
    "collinearity-table": "How much each part of the model is blurred by the others",
    "collinearity-line": _collinearity_line,
    "collinearity-exposure": _collinearity_line,
    "collinearity-adjustment": lambda facts: (
        f"{_named(facts['adjustment'])} can hardly be told apart from the rest of the adjustment. This widens their "
        "own intervals; the exposure's odds ratio is adjusted for them all the same."
    ),
    "collinearity-one-part": "The model has only one column or set of related columns, so nothing can overlap with it.",
    "collinearity-no-exposure": "No column of the model is an exposure.",
    "collinearity-no-number": "The part is all but a combination of the other columns: no factor can be trusted.",
    "collinearity-explanation": (
        "The generalised variance inflation (Fox & Monette, 1992) is the factor by which the joint variance of a "
        "part's estimates exceeds what it would be if the part were unrelated to the other columns, as the model "
        "weighs the records. Its root, shared out over the part's coefficients, is the factor by which the standard "
        "errors are wider. Columns in one term, or in terms that share a column, are one part. Overlap among "
        "adjustment columns does not harm the exposure's estimate; overlap with the exposure widens its interval, "
        "which is then honestly wide: leaving a confounder out to narrow it would trade precision for bias."
    ),
    "linearity-title": "Do the numbers act as straight lines?",
    "linearity-table": "A curve in place of each straight line",
    "linearity-line": _linearity_line,
    "linearity-explanation": _linearity_explanation,
    "linearity-few-values": "has fewer than five distinct values, too few for a curve; it could enter as levels.",
    "linearity-values-pile-up": "has its values piled up so that no three knots can be told apart.",
    "linearity-tied": "has no curve of its own: one is already a combination of the other columns.",
    "linearity-no-fit": "has no curve: with one in place of the line the model has no finite maximum.",
    "linearity-no-departure": "The curve leaves the line further than can be put in a number.",
    "linearity-no-exposure": "The exposure has no single odds ratio that stands beside a curve of another column.",
    "linearity-figure-title": "{column}: a curve beside the straight line",
    "linearity-figure-alt": lambda facts: (
        f"Odds ratio against {facts['column']}, relative to its median, as a curve with its band and as the model's "
        f"straight line; likelihood ratio {decimal(facts['statistic'], 1)} on "
        f"{plural(facts['df'], 'degree of freedom', 'degrees of freedom')}, p {_p(facts['p'])}."
    ),
    "not-a-straight-line": _not_straight,
    "events-per-parameter-title": "Are there enough events?",
    "events-per-parameter-enough": _events_line(", enough by the usual rough guide of ten."),
    "events-per-parameter-few": _events_line(
        ", fewer than the usual rough guide of ten: estimates may lie somewhat too far from 1 and intervals be rough."
    ),
    "events-per-parameter-very-few": _events_line(
        ": the model asks more than these records can answer. Estimates tend to lie too far from 1 and intervals are "
        "not to be trusted; fewer adjustment columns, chosen beforehand, or a penalised fit would serve better."
    ),
    "events-per-parameter-no-columns": "The model has no coefficient beside the intercept.",
    "events-per-parameter-explanation": (
        "Records of the rarer outcome divided by the coefficients beside the intercept. Ten was put forward by Peduzzi "
        "et al. (1996); Vittinghoff & McCulloch (2007) found five to nine often enough when one exposure is adjusted "
        "for confounders, and van Smeden et al. (2016) found no one number that holds everywhere. It is a rough guide, "
        "not a rule to pass or fail."
    ),
    "sparse-cells-title": "Are any levels short of records?",
    "sparse-cells-table": "Records and events by level",
    "sparse-cells-line": _sparse_line,
    "sparse-exposure-levels": lambda facts: (
        f"Fewer than {facts['few']} events, or records without one, stand behind {_named(facts['levels'])}. "
        + (
            "Exact limits hold there all the same; do not lean on the estimate."
            if facts["exact"]
            else "Read the profile limits rather than the Wald limits there, and do not lean on the estimate."
        )
    ),
    "sparse-adjustment-levels": lambda facts: (
        f"Fewer than {facts['few']} events, or records without one, stand behind {_named(facts['levels'])}. The "
        "level's own odds ratio is rough; joining it with a like level would cost the exposure little."
    ),
    "sparse-cells-explanation": (
        "Each level of each category column is crossed with the outcome; a level with fewer than {few} events or fewer "
        "than {few} records without one is named. Estimates from such levels are drawn away from 1 and large-sample "
        "intervals are rough (Greenland, Mansournia & Altman, 2016)."
    ),
    "overlap-title": "Can the exposure's groups be compared?",
    "overlap-table": "Records outside the overlap",
    "overlap-line": _overlap_line,
    "overlap-number-line": lambda facts: (
        f"The adjustment columns explain {_whole_percent(facts['explained'])} of the variance of {facts['exposure']}; "
        f"{_whole_percent((1.0 - facts['explained']) ** 0.5)} of its standard deviation is left to learn from."
        if facts["explained"] > 0.0
        else f"The adjustment columns explain none of the variance of {facts['exposure']}."
    ),
    "overlap-nothing-adjusted": "Nothing is adjusted for beside the exposure, so there is nothing to overlap across.",
    "overlap-no-exposure": "The model names no exposure.",
    "overlap-not-fitted": "No model of the exposure on the adjustment columns could be fitted.",
    "overlap-no-category": "The share of records outside the overlap is for an exposure in groups.",
    "overlap-no-number": "The share of variance that the adjustment columns explain is for a number exposure.",
    "overlap-none-outside": "No record is known to lie outside the overlap, so none was left out.",
    "overlap-not-refitted": "Without the records outside the overlap the exposure has no single odds ratio.",
    "overlap-figure-title": "{group} and {other} across the adjustment columns",
    "overlap-figure-axis": "Probability of “{group}” from the adjustment columns, were both groups equally large",
    "overlap-figure-alt": (
        "Records of “{group}” and of “{other}” by the probability of “{group}” that the "
        "adjustment columns give them; outside the overlap are those below 0.05 or above 0.95."
    ),
    "overlap-explanation": (
        "A logistic model foretells the exposure from the adjustment columns. Its probability is put on the footing "
        "that both groups were equally large (the preference score of Walker et al., 2013), so that a rare exposure "
        "does not look like a lack of overlap. Where it is below 0.05 or above 0.95 hardly anybody in the other group "
        "is alike, and the odds ratio there rests on the form of the model, not on a comparison (Crump et al., 2009; "
        "Petersen et al., 2012). The model is fitted again without those records. For a number, the share of its "
        "variance that the adjustment columns explain is given instead."
    ),
    "little-overlap": _overlap_line,
    "little-variation-left": lambda facts: (
        f"The adjustment columns explain {_whole_percent(facts['explained'])} of the variance of {facts['exposure']}: "
        "little of it is left that differs between otherwise like records."
    ),
    "independence-title": "Does each record stand for itself?",
    "independence-identifier": (
        "No identifier repeats, so no record stands twice; the records are taken to be independent of one another, "
        "which an identifier of records, rather than of people, cannot show."
    ),
    "independence-unchecked": (
        "The records are taken to be independent; no identifier shows that each is of another person."
    ),
    "independence-not-looked-at": (
        "The records are taken to be independent; they are more than were held in memory, so nobody has looked whether "
        "an identifier repeats among them."
    ),
    "independence-grouped": "The records are grouped counts, each record taken to be a different, independent person.",
    "independence-matched": (
        "The design is matched but the records are analysed as single ones: odds ratios then tend to lie too near 1, "
        "and matched sets call for a conditional likelihood."
    ),
    "independence-explanation": (
        "Standard errors, limits and p-values take every record to tell something new. They are too narrow where "
        "people come more than once, or in groups that share what was not recorded (families, wards, villages). "
        "Adjusting for the group as a column helps where groups are few and large. The records themselves cannot show "
        "independence; how they were gathered does."
    ),
}
