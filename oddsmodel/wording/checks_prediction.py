"""Sentences of the checks of prediction: calibration in numbers, discrimination, validation, size."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, decimal, p_value, plural
from oddsmodel.wording.say import Sentence

Facts = Mapping[str, Any]


def _per_100(gap: float) -> str:
    """A difference of two shares, in events per 100."""
    return "under 0.1 per 100" if gap < 0.001 else f"{decimal(100 * gap, 1)} per 100"


def _test(p: float | None) -> str:
    if p is None:
        return ""
    text = p_value(p)
    return f" (Spiegelhalter’s test, p {text})" if " " in text else f" (Spiegelhalter’s test, p = {text})"


def _calibration_error_line(facts: Facts) -> str:
    if facts["errors"] is None:
        return f"There are too few records for a smooth curve of the observed share{_test(facts['p'])}."
    integrated, chance = facts["errors"]
    line = (
        f"The smooth observed share lies {_per_100(integrated)} from the fitted probability on average, where chance "
        f"alone gives about {_per_100(chance)} at most{_test(facts['p'])}"
    )
    if facts["looks"]:
        return f"{line}: the shape is worth a look, as a curve or an interaction may be missing from the formula."
    return f"{line}."


def _size_line(facts: Facts) -> str:
    there, needed, shrinkage = facts["analysed_records"], facts["needed"], facts["shrinkage"]
    if needed is None or shrinkage is None:
        return (
            "The columns add no more to the fit than as many columns of noise would, so no number of records can be "
            "named that is enough for prediction; do not use this model to predict."
        )
    slope = f"a calibration slope of about {decimal(shrinkage)} is to be expected among other records like these"
    line = (
        f"For prediction, a model like this asks for {count(needed)} records at the strictest of the criteria; there "
        f"are {count(there)}"
    )
    return f"{line}, and {slope}." if there >= needed else f"{line}. {slope[0].upper()}{slope[1:]}, where 1 is right."


def _validation_line(facts: Facts) -> str:
    if facts["slope"] is None or facts["corrected"] is None:
        return (
            "Too many resamples could not be fitted for a correction of optimism: the model leans on a handful of "
            "records, and what it does among others is not known."
        )
    line = (
        f"Corrected for optimism, the area under the curve is {decimal(facts['corrected'], 3)} (on the records fitted, "
        f"{decimal(facts['area'], 3)}) and the calibration slope {decimal(facts['slope'])}"
    )
    if facts["verdict"] == "fine":
        return f"{line}, where 1 is right."
    return (
        f"{line}, where 1 is right: among other records like these, high probabilities would be too high and low ones "
        "too low, so shrink the coefficients or use fewer columns before predicting."
    )


def _validation_too_large(facts: Facts) -> str:
    why = "Resampling so many rows with so many columns would take too long"
    if facts["expected"] is None:
        return f"{why}, so it is left out."
    return (
        f"{why}, so it is left out. From the number of coefficients and the likelihood ratio alone, a calibration "
        f"slope of about {decimal(facts['expected'], 4)} is to be expected (van Houwelingen & le Cessie, 1990), where "
        "1 means no optimism."
    )


def _validation_note(facts: Facts) -> str:
    resamples, repeats = facts["resamples"], facts["repeats"]
    folds = facts["folds"] * repeats
    times = "once" if repeats == 1 else f"{count(repeats)} times"
    note = (
        f"{count(resamples)} resamples; {count(facts['folds'])} folds, {times}. On the records fitted, slope and "
        "calibration in the large are 1 and 0 by construction and are not shown."
    )
    lost, missed = resamples - facts["resamples_fitted"], folds - facts["folds_fitted"]
    if not lost and not missed:
        return note
    lacking = [f"to {count(lost)} of the resamples"] if lost else []
    lacking += [f"with {count(missed)} of the {count(folds)} folds held out"] if missed else []
    return (
        f"{note} The model could not be fitted {' or '.join(lacking)}, because outcomes were separated or a level was "
        "absent there. These are left out, so that the corrected values still flatter somewhat."
    )


def _no_risk(what: str) -> Sentence:
    return f"{what} on the share of cases, which a {{design}} study fixes by its sampling, so they are left out."


SENTENCES: dict[str, Sentence] = {
    "prediction-one-outcome": "All records have the same outcome, so there is nothing to predict.",
    "prediction-no-columns": "The model has no column besides the intercept, and predicts the same for everybody.",
    "prediction-one-risk": "The model gives every record the same probability, so there is nothing to validate.",
    # calibration in numbers
    "calibration-error-title": "How far observed shares lie from fitted probabilities",
    "calibration-error-line": _calibration_error_line,
    "calibration-error-seen": _calibration_error_line,
    "calibration-error-no-risk": _no_risk("Errors of calibration and the parts of the Brier score rest"),
    "calibration-error-few": "There are fewer than 10 different probabilities, or than 50 records, for a smooth curve.",
    "calibration-error-table": "Distance of the smooth observed share from the fitted probability",
    "calibration-error-heading-measure": "Over the records",
    "calibration-error-heading-value": "Distance",
    "calibration-error-integrated": "Mean (integrated calibration index)",
    "calibration-error-median": "Median (E50)",
    "calibration-error-ninetieth": "90 of 100 are below (E90)",
    "calibration-error-largest": "Largest",
    "calibration-error-by_chance": "Mean by chance alone",
    "calibration-error-explanation": (
        "The distance between a smooth curve of the observed share and the fitted probability, over all records "
        "(Austin & Steyerberg, 2019). The curve is a local straight line over the nearest 75% of the records "
        "(Cleveland, 1979); the largest distance mostly lies at an end, where it rests on few records. Beside the "
        "mean stands what it would be on average if the probabilities were right and came from elsewhere; on the "
        "records fitted it is smaller still. The band of the figure is pointwise. Overall level and slope of "
        "calibration are 0 and 1 on the records fitted by construction, whatever the model, and are shown by "
        "internal validation only.\n"
        "Spiegelhalter’s test (1986) asks whether the squared distances of outcomes from probabilities are as large "
        "as the probabilities say. In its usual form it is wrong on the records fitted, where it would hardly ever "
        "find anything; here the weights 1 − 2p are freed of what the model’s columns explain of them before they "
        "are used. It is left out where the statistic is not near normal (skewness beyond 0.5, or excess kurtosis "
        "beyond 1). With many records it finds misfit too small to matter: the distances say how large it is. It is "
        "called worth a look where the mean distance is above a tenth of the share of the rarer outcome and either "
        "twice what chance gives or p is under 0.01."
    ),
    "calibration-band-title": "Observed share against fitted probability, with the band of the curve",
    "calibration-band-alt": lambda facts: (
        "Smooth curve of the observed share against the fitted probability with its pointwise band, and observed "
        f"shares with intervals in {plural(facts['groups'], 'group')}."
    ),
    "spiegelhalter-title": "Spiegelhalter’s test, with what the columns explain taken out",
    "spiegelhalter-row": "Squared distances against those the probabilities give",
    "spiegelhalter-heading-statistic": "Comparison",
    "spiegelhalter-heading-z": "z",
    "spiegelhalter-heading-p": "p-value",
    "spiegelhalter-nothing-left": (
        "The columns explain all that Spiegelhalter’s test looks at, so that nothing is left to test."
    ),
    "spiegelhalter-not-normal": (
        "Among so few records the statistic of Spiegelhalter’s test is not near normal, so it is left out."
    ),
    "brier-parts-title": "Parts of the Brier score, in tenths of the fitted probability",
    "brier-parts-heading-part": "Part",
    "brier-parts-heading-value": "Adds to the score, in thousandths",
    "brier-parts-reliability": "Reliability: distance of observed shares from mean probabilities",
    "brier-parts-resolution": "Resolution: how far the groups’ shares lie apart (taken off)",
    "brier-parts-uncertainty": "Uncertainty: that of the outcome itself",
    "brier-parts-within_variance": "Spread of probabilities within groups",
    "brier-parts-within_covariance": "How outcomes follow it within groups (taken off)",
    "brier-parts-score": "Brier score, their sum",
    "brier-parts-note": "The parts are those of Stephenson, Coelho & Jolliffe (2008), which add up exactly.",
    # discrimination
    "discrimination-title": "Precision, recall, and measures named after R²",
    "discrimination-no-risk": _no_risk("Precision, Tjur’s D and the measures named after R² depend"),
    "discrimination-table": "Measures of discrimination and of fit, with what they are not",
    "discrimination-heading-measure": "Measure",
    "discrimination-heading-value": "Value",
    "discrimination-heading-is-not": "What it is not",
    "discrimination-average_precision": "Average precision",
    "discrimination-average_precision-is-not": (
        "Not comparable where events are more or less common: a coin’s toss has the share of events"
    ),
    "discrimination-tjur": "Tjur’s D, the coefficient of discrimination",
    "discrimination-tjur-is-not": "Not a share of anything explained: the gap between two mean probabilities",
    "discrimination-mcfadden": "McFadden’s R²",
    "discrimination-mcfadden-is-not": "Not a share of variance: far below that of a straight-line model as good",
    "discrimination-cox_snell": "Cox & Snell’s R²",
    "discrimination-cox_snell-is-not": "Not out of 1: even perfect prediction stays below, the more the rarer events",
    "discrimination-nagelkerke": "Nagelkerke’s R²",
    "discrimination-nagelkerke-is-not": "Not a share of variance: Cox & Snell’s over the largest it can be",
    "discrimination-explanation": (
        "Precision is the share of events among the records above a cut, recall the share of all events that lie "
        "there; average precision is the mean of the former over the events, each at its own probability, without a "
        "line between the points (Davis & Goadrich, 2006). Tjur’s D (2009) is the mean probability of the records "
        "with the event less that of the others. The measures named after R² (McFadden, 1974; Cox & Snell, 1989; "
        "Nagelkerke, 1991) restate the likelihood ratio on a scale from 0; none is the share of variance explained "
        "that the name brings to mind, none says whether the model fits, and none is comparable between sets of "
        "records with another share of events. Measured on the records that the model was fitted to, all of them "
        "flatter."
    ),
    "precision-title": "Precision against recall",
    "precision-alt": lambda facts: (
        "Share of events among the records above a cut against the share of all events found there. Average precision "
        f"{decimal(facts['average'], 2)}; a coin’s toss finds {decimal(facts['share'], 2)}."
    ),
    "figure-precision": "Share of events among those above the cut",
    "figure-recall": "Share of all events above the cut",
    "figure-average-precision": "Average precision {average}",
    "figure-coin": "share of events, as by a coin’s toss",
    "figure-smooth-band": "smooth curve, with its band",
    # internal validation
    "validation-title": "Internal validation: what to expect among other records like these",
    "validation-line": _validation_line,
    "predictions-too-extreme": _validation_line,
    "validation-too-large": _validation_too_large,
    "validation-matched": (
        "The sets of a matched study would have to be drawn whole, and the plan does not say which they are, so "
        "internal validation is left out."
    ),
    "validation-few-events": (
        "The rarer outcome is too rare here for resampling, which needs at least {fewest} records of it."
    ),
    "validation-few-groups": lambda facts: (
        f"Whole groups would have to be drawn, and {plural(facts['groups'], 'group')} are too few for it: at least "
        f"{facts['fewest']} are needed."
    ),
    "validation-few-fitted": "The model could not be fitted to half of the resamples or more.",
    "validation-no-risk": (
        "It rests on the intercept, which a {design} study fixes by its sampling of cases and controls."
    ),
    "validation-heading-measure": "Measure",
    "validation-heading-apparent": "On the records fitted",
    "validation-heading-optimism": "Optimism",
    "validation-heading-corrected": "Corrected for optimism",
    "validation-heading-cross-validated": "Cross-validated",
    "validation-area": "Area under the curve",
    "validation-slope": "Calibration slope (1 is right)",
    "validation-in_the_large": "Calibration in the large (0 is right)",
    "validation-brier": "Brier score (0 is best)",
    "validation-note": _validation_note,
    "validation-explanation": (
        "The model is fitted again to resamples of the records, drawn with replacement. How much better each fit "
        "does on its own resample than on the original records is its optimism, and the mean of that is taken off "
        "(Efron & Gong, 1983; Harrell, Lee & Mark, 1996). In cross-validation the records of each fold are predicted "
        "by a fit to the others (Stone, 1974), with about the same share of events in every fold; the area is of "
        "pairs within a fold, all else of all records together. The slope, and calibration in the large, are those "
        "of the outcome on the linear predictor (Cox, 1958); among few records the cross-validated slope lies "
        "somewhat too low. Groups are drawn whole; cases and controls are drawn apart; knots, means and deviations "
        "that a formula takes from the records are taken anew each time. Columns, knots or cut points chosen by "
        "looking at these records are not chosen anew, and optimism from that is not seen. Nothing here says how the "
        "model would do in another place or time. A slope below 0.9 is worth a look, below 0.8 a caution."
    ),
    # size
    "prediction-size-title": "Records asked for by criteria for prediction models",
    "prediction-size-line": _size_line,
    "too-few-records-for-prediction": _size_line,
    "prediction-size-no-gain": "The columns add no more to the fit than as many columns of noise would.",
    "prediction-size-many-parameters": "The formula for it was found with up to {most} coefficients only.",
    "prediction-size-no-risk": (
        "It rests on the share of events, which a {design} study fixes by its sampling, so it is left out."
    ),
    "prediction-size-table": "How many records each criterion asks for",
    "prediction-size-heading-criterion": "So that …",
    "prediction-size-heading-own": "With the fit found here",
    "prediction-size-heading-usual": "With R² by convention",
    "prediction-size-shrinkage": "… a calibration slope of 0.9 or more is to be expected",
    "prediction-size-optimism": "… Nagelkerke’s R² is too large by at most 0.05",
    "prediction-size-overall_risk": "… the overall risk is known to within 0.05",
    "prediction-size-mean_error": "… single probabilities are off by 0.05 on average",
    "prediction-size-note": lambda facts: (
        "The first two depend on how well the model fits: once as it does here, with Cox & Snell’s R² made smaller "
        f"by its expected shrinkage, once with {100 * facts['share']:.0f}% of the largest it can be, as convention "
        "has it where nothing is known."
    ),
    "prediction-size-explanation": (
        "The criteria are those of Riley et al. (2019, 2020), the last with the formula of van Smeden et al. (2019) "
        "for up to 30 coefficients. They are meant for planning; after the fact they say whether the records were "
        "enough for as many coefficients as were fitted, not counting columns that were tried and left out. Expected "
        "slope: (LR − p) / LR with the likelihood ratio LR of p coefficients (van Houwelingen & le Cessie, 1990). "
        "Fewer records than asked for are worth a look; an expected slope below 0.8 is a caution."
    ),
}
