"""The effect of Hauck and Donner against its closed form, 50-digit derivatives and the likelihood ratio."""

from __future__ import annotations

import sys
from pathlib import Path

import mpmath
import numpy as np
import pytest
from scipy.optimize import brentq

from oddsmodel.inference import likelihood_ratio, maximise
from oddsmodel.inference.penalised import maximise_penalised
from oddsmodel.inference.wald_failure import wald_failure
from oddsmodel.likelihood import BinomialLikelihood, JeffreysPenalisedLikelihood, LogFLikelihood

sys.path.insert(0, str(Path(__file__).parent))
from exact import calendar


def test_a_single_share_fails_where_the_closed_form_says() -> None:
    # z = logit(p) (n p (1 - p))^1/2 is largest where logit(p) tanh(logit(p) / 2) = 2: at shares of 0.083 and 0.917
    # (Yee 2022, quoted from memory)
    tipping = brentq(lambda t: t * np.tanh(t / 2) - 2, 1, 5)
    share = 1 / (1 + np.exp(-tipping))
    assert round(share, 3) == 0.917
    for events in range(1, 100):
        found = wald_failure(maximise(BinomialLikelihood(np.ones((1, 1)), [float(events)], trials=[100.0])))
        logit = np.log(events / (100 - events))
        assert found.slope[0] == pytest.approx(1 - logit * np.tanh(logit / 2) / 2, abs=1e-7)
        assert found.falling[0] == (events > 100 * share or events < 100 * (1 - share))


def test_a_larger_effect_with_a_smaller_statistic() -> None:
    # up to 399 of 400 exposed against 100 of 400: the likelihood ratio grows on, the Wald statistic turns back
    design = np.array([[1.0, 1], [1, 0]])
    statistics, ratios, failing = [], [], []
    for events in (100.0, 300, 360, 390, 399):
        likelihood = BinomialLikelihood(design, [events, 100.0], trials=[400.0, 400])
        fit = maximise(likelihood)
        found = wald_failure(fit)
        statistics.append(found.statistic[1])
        ratios.append(likelihood_ratio(fit, maximise(likelihood, basis=np.eye(2)[:, :1]))[0])
        failing.append(bool(found.falling[1]))
    assert statistics[3] > statistics[4]
    assert ratios == sorted(ratios)
    assert failing == [False, False, False, True, True]


@pytest.mark.parametrize("kind", ["standard normal columns", "year and its square"])
def test_the_slope_against_differences_in_fifty_digits(kind: str) -> None:
    X, y = calendar(kind, 50)
    fit = maximise(BinomialLikelihood(X, y))
    found, p = wald_failure(fit), X.shape[1]
    with mpmath.workdps(50):
        rows = [[mpmath.mpf(float(x)) for x in row] for row in X]

        def statistic(beta: list, j: int) -> tuple[mpmath.mpf, mpmath.mpf]:
            information = mpmath.zeros(p, p)
            for row in rows:
                risk = 1 / (1 + mpmath.exp(-mpmath.fdot(row, beta)))
                for a in range(p):
                    for b in range(p):
                        information[a, b] += risk * (1 - risk) * row[a] * row[b]
            error = mpmath.sqrt((information**-1)[j, j])
            return beta[j] / error, error

        for j in range(p):
            beta = [mpmath.mpf(float(b)) for b in fit.coefficients]
            z, error = statistic(beta, j)
            step = error * mpmath.mpf(10) ** -15
            up, down = list(beta), list(beta)
            up[j] += step
            down[j] -= step
            slope = error * (statistic(up, j)[0] - statistic(down, j)[0]) / (2 * step)
            assert found.statistic[j] == pytest.approx(float(z), rel=1e-6)
            assert found.slope[j] == pytest.approx(float(slope), rel=1e-4)


def test_only_of_converged_fits_that_know_how_their_information_changes() -> None:
    X = np.array([[1.0, 1], [1, 0]])
    with pytest.raises(ValueError, match="converged"):
        wald_failure(maximise(BinomialLikelihood(X, [0.0, 3], trials=[5.0, 9])))
    plain = BinomialLikelihood(X, [2.0, 3], trials=[5.0, 9])
    for fit in (maximise_penalised(JeffreysPenalisedLikelihood(plain)).fit, maximise(LogFLikelihood(plain, (1,), 1.0))):
        with pytest.raises(TypeError, match="information"):
            wald_failure(fit)
