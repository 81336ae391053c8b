"""Sentences of the checks of form that a plan asks for."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from oddsmodel.wording.numbers import decimal, listed, p_value, plural, ratio
from oddsmodel.wording.say import Sentence


def _power(power: float) -> str:
    if power == 0.0:
        return "the log"
    return f"power {decimal(power, 0 if float(power).is_integer() else 1)}"


def _shape(powers: Sequence[float]) -> str:
    """The function that some powers stand for: none, one, or two that may be equal."""
    if not powers:
        return "nothing: no relation is seen"
    if list(powers) == [1.0]:
        return "the straight line"
    if len(powers) == 1:
        return _power(powers[0])
    first, second = powers
    if first != second:
        return f"{_power(first)} and {_power(second)}"
    return "the log and its square" if first == 0.0 else f"{_power(first)}, alone and times the log"


def _withheld(facts: Mapping[str, Any]) -> str:
    return "".join(f" {label} {reason}" for label, reason in facts["withheld"])


def _bent(facts: Mapping[str, Any], curve: str) -> str:
    if not facts["looked_at"]:
        return ""
    if not facts["bent"]:
        return f"No clear bend is seen in the straight line of {listed(facts['looked_at'])}.\n"
    return f"{curve} fits better than the straight line of {listed(facts['bent'])}.\n"


def _powers_explanation(facts: Mapping[str, Any]) -> str:
    lead = ""
    curved = [(label, powers) for label, powers in facts["found"] if powers and powers != [1.0]]
    kept = [label for label, powers in facts["found"] if not powers or powers == [1.0]]
    if curved:
        lead = f"A curve is chosen for {listed([f'{label} ({_shape(powers)})' for label, powers in curved])}"
        lead += f"; nothing speaks against the straight line of {listed(kept)}.\n" if kept else ".\n"
    elif kept:
        lead = f"Nothing speaks against the straight line of {listed(kept)}.\n"
    return lead + (
        "Fractional polynomials (Royston & Altman, 1994) put one or two of the powers −2, −1, −0.5, the log, 0.5, 1, "
        "2 and 3 of a number in the place of its line; a power used twice stands for x^p and x^p log x. All eight "
        "single powers and all 36 pairs are fitted. The closed test (Ambler & Royston, 2001) compares the best pair "
        "with the column left out (4 degrees of freedom), with the straight line (3) and with the best single power "
        "(2), in this order, and stops at the first p-value of 0.05 or more with the simpler of the two; the degrees "
        "of freedom count the choice of a power as one. Of a column that has values of 0 or less, all values are "
        "first raised by a round number that brings the smallest near to a tenth of the range of the middle 90% of "
        "the records (counts from 0 on by 1), and the shape hangs on this; the values are also divided by a "
        "power of ten, which changes nothing. The band takes the powers as known and so is somewhat too narrow. Each "
        "column is tested at 0.05 for itself, the others staying as they are. With many records the smallest bend is "
        "found: the exposure's odds ratio with the line and with the curve says whether it matters." + _withheld(facts)
    )


def _box_tidwell_explanation(facts: Mapping[str, Any]) -> str:
    return _bent(facts, "A power other than 1") + (
        "x log x is set beside each straight line in turn, and the likelihood-ratio test asks whether it adds "
        "anything (Box & Tidwell, 1962). If the log odds follow a power of x near 1, its coefficient by the slope of "
        "the line, plus 1, is a first step towards that power. Columns that have values of 0 or less are raised by a "
        "round number, as the table says, and the power is then that of the raised values. A bend is called seen when "
        "its p-value times the number of columns is below 0.05; with many records the smallest bend is found, and a "
        "bend that turns back on itself is one that no power describes." + _withheld(facts)
    )


def _quantiles_explanation(facts: Mapping[str, Any]) -> str:
    return _bent(facts, "The division into groups") + (
        "Each number that enters as a straight line is cut at its quantiles into fifths, or tenths where there are "
        "500 or more records of either outcome, and the groups take the place of the line, all else staying as it is. "
        "Each group's odds ratio against the group of the median stands at its own median; on a straight line the "
        "points lie along it but for chance (Hosmer, Lemeshow & Sturdivant, 2013). The test sets the groups beside "
        "the line and asks whether they add anything to it. Groups are for looking only: as a model they would make "
        "a step of every cut point, and throw away what differs within a group." + _withheld(facts)
    )


def _interactions_explanation(facts: Mapping[str, Any]) -> str:
    lead = ""
    if facts["p"] is not None:
        words = p_value(facts["p"])
        p = words if words.startswith(("under", "over")) else f"= {words}"
        if facts["p"] < 0.05:
            lead = (
                f"The exposure's odds ratio may well not be the same at all values of the adjustment columns (p {p}); "
                "the one reported is then a kind of average over them.\n"
            )
        else:
            lead = (
                f"The records give no clear sign that the exposure's odds ratio differs with the adjustment columns "
                f"(p {p}). They may be too few to tell.\n"
            )
    text = lead + (
        "The products of every exposure column with every adjustment column are added to the model all at once, and "
        "one test asks whether they add anything. Single products are not named: looked at after the event, some "
        "would stand out by chance. A modifier that matters is named before, in the plan. The model is that of the "
        "odds ratio: with no interaction on this scale there may be one on the scale of risks, and the other way "
        "round. A bend that the model leaves out can show as an interaction."
    )
    if facts["aliased"]:
        text += (
            " Products that are combinations of the columns before them (levels that never meet, products that the "
            "model has already) add nothing and are left out."
        )
    if facts["score"]:
        text += " The test is Rao's score test, which needs no fit of the larger model."
    return text


def _conditions_explanation(facts: Mapping[str, Any]) -> str:
    lead = ""
    if facts["known"] and not facts["bound"]:
        lead = "No strong dependency stands between the coefficients.\n"
    elif facts["known"]:
        lead = (
            f"A strong dependency stands between {listed(facts['bound'])}: the records can tell their coefficients "
            "apart only poorly."
        )
        if not facts["exposed"]:
            lead += " The exposure is not among them."
        lead += "\n"
    return lead + (
        "The columns of the model matrix, weighted as at the estimates and each brought to length one, are taken "
        "apart into directions at right angles; the condition index of a direction is how much shorter it is than "
        "the longest (Belsley, Kuh & Welsch, 1980). Below 10 nothing is amiss; from 30 on a dependency is strong, and "
        "where it holds more than half of the variance of two coefficients or more, these are told apart poorly. The "
        "first table has the constant among the columns, as those authors want it: a number far from 0, such as a "
        "year, is then bound up with the constant, which harms nothing. In the second the constant is projected off "
        "all other columns; this is the one that the verdict rests on where the model has a constant. Columns made "
        "from one number (powers, splines) are always bound up with each other."
    )


def _stability_explanation(facts: Mapping[str, Any]) -> str:
    text = (
        "How far these odds ratios spread is not their uncertainty, and no model among them is to be chosen by its "
        "answer: which columns to adjust for follows from what they are to the exposure and the outcome, and is laid "
        "down beforehand. A choice that leaves out a confounder is wrong however near its answer lies. An odds ratio "
        "also moves away from 1 when a strong predictor enters that is no confounder at all (it is not collapsible).\n"
    )
    if facts["sampled"]:
        text += (
            f"With {plural(facts['columns'], 'adjustment column')} there are more than 2^{facts['whole']} choices of "
            "them; 1000 were drawn, each with the same chance."
        )
    else:
        text += "The model is fitted with every choice of its adjustment columns."
    return text + (
        " A column that is left out takes along every term that it is part of. All models are fitted to the same "
        "records, those that have all columns."
    )


SENTENCES: dict[str, Sentence] = {
    "asked-form-shift": "Added to every value",
    "shift-untold": (
        "What is added to the values of a column is not told where it would give away the smallest value of a few "
        "records."
    ),
    "powers-title": "Powers in place of straight lines",
    "powers-shapes": "The best powers and what the closed test chooses",
    "powers-tests": "The closed test, step by step",
    "powers-best-one": "Best single power",
    "powers-best-two": "Best pair",
    "powers-chosen": "Chosen",
    "powers-shape": lambda facts: _shape(facts["powers"]),
    "powers-against": "Best pair against",
    "powers-against-nothing": "the column left out",
    "powers-against-line": "the straight line",
    "powers-against-one": "the best single power",
    "powers-unsettled": "Fits with some of the powers came to no answer and were passed over.",
    "powers-explanation": _powers_explanation,
    "powers-figure-title": lambda facts: (
        f"{facts['column']}: {'the chosen curve' if facts['chosen'] else 'the best pair'}, {_shape(facts['powers'])}"
    ),
    "powers-figure-alt": lambda facts: (
        f"Odds ratio against {facts['column']}, relative to its median, by {_shape(facts['powers'])} with its band, "
        "and by the model's straight line."
    ),
    "powers-no-constant": "The model has no constant, beside which powers could be set.",
    "powers-few-events": (
        "There are fewer than {least} events, or fewer than {least} records without one: too few for this test."
    ),
    "powers-no-lines": "No number enters the model as a straight line that powers can be set against.",
    "powers-of-a-function": "enters as a function of its values, which is a curve that was chosen beforehand.",
    "powers-few-values": "has fewer than five distinct values, too few for a curve.",
    "powers-no-place": "has values that lie too far apart, or too close together beside their size, for powers.",
    "powers-not-settled": "has no test: a fit that it rests on came to no answer.",
    "box-tidwell-title": "Does a power fit better than the line?",
    "box-tidwell-table": "x log x beside each straight line",
    "box-tidwell-power": "Power after a first step",
    "box-tidwell-no-power": (
        "No power is given where the line's slope is less than two standard errors from 0, or the first step leads "
        "further than to a power of 10 either way."
    ),
    "box-tidwell-explanation": _box_tidwell_explanation,
    "quantiles-title": "Groups in place of straight lines",
    "quantiles-tests": "Quantile groups beside each straight line",
    "quantiles-groups": "Odds ratios of the quantile groups",
    "quantiles-number": "Groups",
    "quantiles-group": "Group",
    "quantiles-median": "Median",
    "quantiles-ratio": "Odds ratio",
    "quantiles-interval": lambda facts: f"{round(100 * facts['level'], 1):g}% interval",
    "quantiles-by-line": "By the straight line",
    "quantiles-reference": "1 (reference)",
    "quantiles-figure-title": "{column}: groups over the straight line",
    "quantiles-figure-alt": lambda facts: (
        f"Odds ratios of {facts['groups']} groups of {facts['column']} at their medians with intervals, relative to "
        "the group of the median, over the model's straight line."
    ),
    "quantiles-explanation": _quantiles_explanation,
    "quantiles-no-lines": "No number enters the model as a straight line that could be cut into groups.",
    "quantiles-few-groups": "has its values piled up so that no three groups can be told apart.",
    "quantiles-no-fit": "has no odds ratios of its groups: one of these has no event, or nothing but events.",
    "interactions-title": "Does the exposure's odds ratio differ with the adjustment columns?",
    "interactions-table": "All products of exposure and adjustment columns at once",
    "interactions-test": "Test",
    "interactions-by-likelihood": "likelihood ratio",
    "interactions-by-score": "Rao's score",
    "interactions-products": "Products",
    "interactions-aliased": "Of these, adding nothing",
    "interactions-statistic": "Chi-square",
    "interactions-explanation": _interactions_explanation,
    "interactions-no-products": "The model has no exposure beside adjustment columns, so there are no products.",
    "interactions-too-many": "The model has more than {most} products of exposure and adjustment columns.",
    "interactions-all-aliased": "Every product is a combination of the columns that the model has already.",
    "interactions-few-events": lambda facts: (
        f"There are fewer than {facts['each']} events, or records without one, for each of the "
        f"{plural(facts['columns'], 'product')} that would be added: a test of so many would tell nothing."
    ),
    "conditions-title": "Which coefficients are poorly told apart?",
    "conditions-table": "Variance shares by condition index, the constant among the columns",
    "conditions-table-without-constant": "Variance shares by condition index, the constant projected off",
    "conditions-coefficient": "Coefficient",
    "conditions-index": lambda facts: f"Index {ratio(facts['index'])}",
    "conditions-note": "Of each coefficient's variance, the share that goes with the largest condition indices.",
    "conditions-no-number": "One column is all but a combination of the others: no index can be trusted.",
    "conditions-no-constant": "There is no constant to be projected off, or nothing beside it.",
    "conditions-explanation": _conditions_explanation,
    "stability-title": "The exposure's odds ratio under other choices of adjustment",
    "stability-range": "Odds ratios over the choices of adjustment columns",
    "stability-without": "With one adjustment column left out",
    "stability-choices": "Choices with at least one column",
    "stability-reported": "As reported",
    "stability-smallest": "Smallest",
    "stability-median": "Median",
    "stability-largest": "Largest",
    "stability-left-out": "Left out",
    "stability-nothing-left-out": "nothing",
    "stability-not-uncertainty": "The spread is not the uncertainty of the odds ratio: the intervals tell that.",
    "stability-figure-title": "{label}: odds ratios under all choices of adjustment",
    "stability-figure-alt": lambda facts: (
        f"The odds ratio of {facts['label']} under {plural(facts['choices'], 'choice')} of adjustment columns, in "
        f"rising order, from {ratio(facts['smallest'])} to {ratio(facts['largest'])}, with the reported one as a "
        "level line. The spread is not uncertainty."
    ),
    "stability-few-columns": (
        "The model adjusts for fewer than two columns; the crude and the adjusted odds ratio say it all."
    ),
    "stability-no-odds-ratio": "The exposure has no single odds ratio that could be followed over the choices.",
    "stability-explanation": _stability_explanation,
}
