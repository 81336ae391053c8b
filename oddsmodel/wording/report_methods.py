"""The methods paragraph, sentence by sentence, and the references it may cite."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from oddsmodel.wording.numbers import count, listed, plural
from oddsmodel.wording.say import Sentence
from oddsmodel.wording.study_methods import METHOD_WORDS, prior_words

REFERENCES: dict[str, str] = {
    "albert-anderson-1984": (
        "Albert A, Anderson JA. On the existence of maximum likelihood estimates in logistic regression models. "
        "Biometrika 1984; 71: 1–10."
    ),
    "armitage-1955": (
        "Armitage P. Tests for linear trends in proportions and frequencies. Biometrics 1955; 11: 375–386."
    ),
    "austin-2009": (
        "Austin PC. Balance diagnostics for comparing the distribution of baseline covariates between treatment groups "
        "in propensity-score matched samples. Statistics in Medicine 2009; 28: 3083–3107."
    ),
    "breslow-day-1980": (
        "Breslow NE, Day NE. Statistical Methods in Cancer Research, volume 1: The Analysis of Case-Control Studies. "
        "Lyon: International Agency for Research on Cancer, 1980."
    ),
    "brier-1950": (
        "Brier GW. Verification of forecasts expressed in terms of probability. Monthly Weather Review 1950; 78: 1–3."
    ),
    "cochran-1954": ("Cochran WG. Some methods for strengthening the common χ² tests. Biometrics 1954; 10: 417–451."),
    "cameron-miller-2015": (
        "Cameron AC, Miller DL. A practitioner's guide to cluster-robust inference. Journal of Human Resources 2015; "
        "50: 317–372."
    ),
    "cox-1958": (
        "Cox DR. The regression analysis of binary sequences. Journal of the Royal Statistical Society, Series B 1958; "
        "20: 215–242."
    ),
    "delong-1988": (
        "DeLong ER, DeLong DM, Clarke-Pearson DL. Comparing the areas under two or more correlated receiver operating "
        "characteristic curves: a nonparametric approach. Biometrics 1988; 44: 837–845."
    ),
    "firth-1993": "Firth D. Bias reduction of maximum likelihood estimates. Biometrika 1993; 80: 27–38.",
    "fox-monette-1992": (
        "Fox J, Monette G. Generalized collinearity diagnostics. Journal of the American Statistical Association 1992; "
        "87: 178–183."
    ),
    "greenland-mansournia-2015": (
        "Greenland S, Mansournia MA. Penalization, bias reduction, and default priors in logistic and related "
        "categorical and survival regressions. Statistics in Medicine 2015; 34: 3133–3143."
    ),
    "heinze-schemper-2002": (
        "Heinze G, Schemper M. A solution to the problem of separation in logistic regression. Statistics in Medicine "
        "2002; 21: 2409–2419."
    ),
    "hirji-1987": (
        "Hirji KF, Mehta CR, Patel NR. Computing distributions for exact logistic regression. Journal of the American "
        "Statistical Association 1987; 82: 1110–1117."
    ),
    "mehta-patel-1995": (
        "Mehta CR, Patel NR. Exact logistic regression: theory and examples. Statistics in Medicine 1995; 14: "
        "2143–2160."
    ),
    "greenland-1999": (
        "Greenland S, Robins JM, Pearl J. Confounding and collapsibility in causal inference. Statistical Science "
        "1999; 14: 29–46."
    ),
    "harrell-2015": "Harrell FE. Regression Modeling Strategies, 2nd edition. Cham: Springer, 2015.",
    "hosmer-lemeshow-1980": (
        "Hosmer DW, Lemeshow S. Goodness of fit tests for the multiple logistic regression model. Communications in "
        "Statistics: Theory and Methods 1980; 9: 1043–1069."
    ),
    "konis-2007": (
        "Konis K. Linear programming algorithms for detecting separated data in binary logistic regression models. "
        "DPhil thesis, University of Oxford, 2007."
    ),
    "liang-zeger-1986": (
        "Liang KY, Zeger SL. Longitudinal data analysis using generalized linear models. Biometrika 1986; 73: 13–22."
    ),
    "paul-2013": (
        "Paul P, Pennell ML, Lemeshow S. Standardizing the power of the Hosmer–Lemeshow goodness of fit test in large "
        "data sets. Statistics in Medicine 2013; 32: 67–80."
    ),
    "peduzzi-1996": (
        "Peduzzi P, Concato J, Kemper E, Holford TR, Feinstein AR. A simulation study of the number of events per "
        "variable in logistic regression analysis. Journal of Clinical Epidemiology 1996; 49: 1373–1379."
    ),
    "pregibon-1981": "Pregibon D. Logistic regression diagnostics. Annals of Statistics 1981; 9: 705–724.",
    "prentice-pyke-1979": (
        "Prentice RL, Pyke R. Logistic disease incidence models and case-control studies. Biometrika 1979; 66: 403–411."
    ),
    "puhr-2017": (
        "Puhr R, Heinze G, Nold M, Lusa L, Geroldinger A. Firth's logistic regression with rare events: accurate "
        "effect estimates and predictions? Statistics in Medicine 2017; 36: 2302–2317."
    ),
    "santner-duffy-1986": (
        "Santner TJ, Duffy DE. A note on A. Albert and J. A. Anderson's conditions for the existence of maximum "
        "likelihood estimates in logistic regression models. Biometrika 1986; 73: 755–758."
    ),
    "venzon-moolgavkar-1988": (
        "Venzon DJ, Moolgavkar SH. A method for computing profile-likelihood-based confidence intervals. Journal of "
        "the Royal Statistical Society, Series C 1988; 37: 87–94."
    ),
    "wald-1943": (
        "Wald A. Tests of statistical hypotheses concerning several parameters when the number of observations is "
        "large. Transactions of the American Mathematical Society 1943; 54: 426–482."
    ),
    "westreich-greenland-2013": (
        "Westreich D, Greenland S. The table 2 fallacy: presenting and interpreting confounder and modifier "
        "coefficients. American Journal of Epidemiology 2013; 177: 292–298."
    ),
    "woolf-1955": (
        "Woolf B. On estimating the relation between blood group and disease. Annals of Human Genetics 1955; "
        "19: 251–253."
    ),
}

DESIGNS = {
    "cohort": "a cohort study",
    "cross-sectional": "a cross-sectional study",
    "case-control": "a case-control study",
    "matched case-control": "a matched case-control study",
    "trial": "a trial",
}


def _records(facts: Mapping[str, Any]) -> str:
    words = f"The records come from {DESIGNS.get(facts['design'], facts['design'])}"
    if facts["read"] is not None:
        words += f"; {plural(facts['read'], 'record')} were read"
        if facts["analysed"] is not None:
            words += f" and {count(facts['analysed'])} analysed"
            words += f", {count(facts['events'])} of them with the event" if facts["events"] is not None else ""
    return f"{words}."


CITED = {
    "maximum likelihood": "",
    "penalised": " with Jeffreys' penalty (Firth, 1993; Heinze & Schemper, 2002)",
    "log-F": " (Greenland & Mansournia, 2015)",
    "exact": " (Hirji, Mehta & Patel, 1987; Mehta & Patel, 1995)",
}
"""What is said of each method beside its name."""

METHOD_REFERENCES: dict[str, tuple[str, ...]] = {
    "penalised": ("firth-1993", "heinze-schemper-2002"),
    "log-F": ("greenland-mansournia-2015",),
    "exact": ("hirji-1987", "mehta-patel-1995"),
}


def _model(facts: Mapping[str, Any]) -> str:
    role = "exposure" if len(facts["exposures"]) == 1 else "exposures"
    words = (
        f"The odds of {facts['outcome']} were modelled by logistic regression (Cox, 1958), fitted by "
        f"{METHOD_WORDS[facts['method']]}{CITED[facts['method']]}, with {listed(facts['exposures'])} as {role}"
    )
    return f"{words}, adjusted for {listed(facts['adjustment'])}." if facts["adjustment"] else f"{words}."


def _profile_prior(facts: Mapping[str, Any]) -> str:
    prior = facts["prior"]
    held = f" With {prior_words(prior['m'], prior['labels'])}, intervals" if prior is not None else "Intervals"
    return (
        f"{held.strip()} at {facts['level']} were taken from the profile of the likelihood with its prior (Venzon & "
        "Moolgavkar, 1988), with Wald intervals (Wald, 1943) beside them."
    )


def _other_method(facts: Mapping[str, Any]) -> str:
    names = [f"“{name}”" for name in facts["names"]]
    were = "was" if len(names) == 1 else "were"
    return f"{listed(names)} {were} fitted by {METHOD_WORDS[facts['method']]}{CITED[facts['method']]}."


def _several(facts: Mapping[str, Any]) -> str:
    return f"The plan sets {plural(facts['number'], 'model')}: {listed(facts['names'])}."


SENTENCES: dict[str, Sentence] = {
    "methods-records": _records,
    "methods-complete-records": (
        "Records in which the outcome or a column of the model was not recorded were left out, each counted once under "
        "the first reason that held."
    ),
    "methods-model": _model,
    "methods-case-control": (
        "Since the sampling of cases and controls moves the intercept alone, the odds ratios are estimated as in a "
        "cohort (Prentice & Pyke, 1979); the intercept is not interpreted."
    ),
    "methods-profile": (
        "Intervals at {level} were taken from the profile likelihood (Venzon & Moolgavkar, 1988), with Wald intervals "
        "(Wald, 1943) beside them."
    ),
    "methods-profile-penalised": (
        "Intervals at {level} were taken from the profile of the penalised likelihood, its penalty being that of the "
        "whole model (Heinze & Schemper, 2002), with Wald intervals (Wald, 1943) beside them."
    ),
    "methods-profile-prior": _profile_prior,
    "methods-separated": (
        "Whether the likelihood has a maximum was decided by linear programming (Albert & Anderson, 1984; Santner & "
        "Duffy, 1986; Konis, 2007). Odds ratios that have a finite estimate were estimated from the records that are "
        "not separated; of the others the limit at {level} that the profile likelihood has on one side is given."
    ),
    "methods-penalised-beside": (
        "Beside it the same model was fitted by penalised likelihood with Jeffreys' penalty (Firth, 1993), with "
        "{level} intervals from the profile of the penalised likelihood (Heinze & Schemper, 2002)."
    ),
    "methods-other-method": _other_method,
    "methods-corrected-intercept": (
        "Intercepts for predicted risks were corrected so that the risks average to the share observed (Puhr et al., "
        "2017)."
    ),
    "methods-exact": (
        "Limits at {level} are exact: each is that of a one-sided test of the conditional distribution, with mid-P "
        "limits beside them."
    ),
    "methods-wald": "Intervals at {level} are Wald intervals (Wald, 1943).",
    "methods-terms": (
        "Whole terms were tested by the likelihood ratio of two models, one with the term and one without it, neither "
        "of them with terms that contain it."
    ),
    "methods-crude": (
        "Crude odds ratios come from models of the exposure alone, on the same records as the adjusted ones; the two "
        "can differ without confounding, since odds ratios do not collapse over groups (Greenland, Robins & Pearl, "
        "1999)."
    ),
    "methods-characteristics": (
        "Groups are described side by side with standardised differences (Austin, 2009), without tests."
    ),
    "methods-two-by-two": (
        "The two-by-two table carries the interval of Woolf (1955) and, where the table is small enough, the exact "
        "conditional estimate and limits (Breslow & Day, 1980)."
    ),
    "methods-adjustment": (
        "Odds ratios of the adjustment columns are not interpreted as effects (Westreich & Greenland, 2013)."
    ),
    "methods-checks": lambda facts: f"The fit was examined by {listed(facts['ways'])}.",
    "methods-several-models": _several,
    "methods-disclosure": (
        "Counts under {below}, and the numbers from which they could be worked out, are withheld from this report."
    ),
    "methods-software": "The analysis was carried out with {versions}.",
    "way-hosmer_lemeshow": (
        "the Hosmer–Lemeshow test on covariate patterns (Hosmer & Lemeshow, 1980; Paul, Pennell & Lemeshow, 2013)"
    ),
    "way-auc": (
        "the area under the receiver operating characteristic curve with its interval (DeLong, DeLong & "
        "Clarke-Pearson, 1988)"
    ),
    "way-brier": "the Brier score (Brier, 1950)",
    "way-calibration": "observed shares against predicted risks",
    "way-collinearity": "generalised variance inflation (Fox & Monette, 1992)",
    "way-influence": "leverage, residuals and the influence of covariate patterns (Pregibon, 1981)",
    "way-linearity": "a restricted cubic spline against the straight line for each number column (Harrell, 2015)",
    "way-events_per_parameter": "the number of events per parameter (Peduzzi et al., 1996)",
    "way-sparse_cells": "the smallest counts of exposure by outcome",
    "way-overlap": "the overlap of the exposure groups across the adjustment columns",
    "way-residual_tests": "the Pearson and deviance statistics on covariate patterns",
}

WAYS: dict[str, tuple[str, tuple[str, ...]]] = {
    "hosmer_lemeshow": ("way-hosmer_lemeshow", ("hosmer-lemeshow-1980", "paul-2013")),
    "auc": ("way-auc", ("delong-1988",)),
    "brier": ("way-brier", ("brier-1950",)),
    "calibration": ("way-calibration", ()),
    "collinearity": ("way-collinearity", ("fox-monette-1992",)),
    "influence": ("way-influence", ("pregibon-1981",)),
    "linearity": ("way-linearity", ("harrell-2015",)),
    "events_per_parameter": ("way-events_per_parameter", ("peduzzi-1996",)),
    "sparse_cells": ("way-sparse_cells", ()),
    "overlap": ("way-overlap", ()),
    "residual_tests": ("way-residual_tests", ()),
}
"""By the name of a check: the code of its words in the methods paragraph, and the references it rests on."""
