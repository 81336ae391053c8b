"""log-F(m, m) priors against their density, data augmentation by statsmodels and 50-digit arithmetic."""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
import statsmodels.api as sm
from scipy.integrate import quad
from scipy.optimize import approx_fprime
from scipy.stats import f as f_distribution

from oddsmodel.inference import certify, likelihood_ratio, maximise, profile_intervals
from oddsmodel.likelihood import BinomialLikelihood, LogFLikelihood
from oddsmodel.likelihood.log_f import prior_interval


def records(seed: int = 1, n: int = 60) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    X = np.column_stack([np.ones(n), rng.random(n) < 0.3, rng.normal(50, 10, n)]).astype(float)
    return X, (rng.random(n) < 0.4).astype(float)


@pytest.mark.parametrize("m", [1.0, 2.0, 3.5])
def test_the_density_is_that_of_a_logarithm_of_f(m: float) -> None:
    # b is log-F(m, m) when exp(b) is F(m, m): its density is exp(b) f(exp(b)); a constant is left out
    nothing = BinomialLikelihood(np.zeros((1, 1)), [0.0])
    value = lambda b: float(LogFLikelihood(nothing, (0,), m).evaluate(np.array([b])).log_likelihood[0]) + np.log(2)  # noqa: E731
    total = quad(lambda b: np.exp(value(b)), -200, 200)[0]
    for b in (-3.0, 0.0, 0.4, 5.0):
        density = float(np.exp(b) * f_distribution.pdf(np.exp(b), m, m))
        assert np.exp(value(b)) / total == pytest.approx(density, rel=1e-6)


@pytest.mark.parametrize(("m", "per"), [(1.0, 1.0), (2.0, 10.0), (0.5, -5.0), (20.0, 0.1)])
def test_against_data_augmentation_by_statsmodels(m: float, per: float) -> None:
    # Greenland & Mansournia 2015, section 2: m/2 events and m/2 others among pseudo-records without an intercept, whose
    # only column is the coefficient's, at the value of its unit
    X, y = records()
    prior = maximise(LogFLikelihood(BinomialLikelihood(X, y), (1, 2), m, (1.0, per)))
    augmented = np.vstack([X, [[0, 1.0, 0], [0, 1.0, 0], [0, 0, per], [0, 0, per]]])
    outcome, weights = np.append(y, [1.0, 0, 1, 0]), np.append(np.ones(len(y)), [m / 2] * 4)
    reference = sm.GLM(outcome, augmented, family=sm.families.Binomial(), freq_weights=weights).fit(tol=1e-14)
    assert prior.status == "converged"
    assert prior.coefficients == pytest.approx(reference.params, rel=1e-8, abs=1e-10)
    assert prior.standard_errors == pytest.approx(reference.bse, rel=1e-7)


def test_the_unit_of_the_plan_and_not_that_of_the_column_bears_the_prior() -> None:
    X, y = records(3)
    in_months = X.copy()
    in_months[:, 2] *= 12
    one = maximise(LogFLikelihood(BinomialLikelihood(X, y), (2,), 4.0, (10.0,)))
    other = maximise(LogFLikelihood(BinomialLikelihood(in_months, y), (2,), 4.0, (120.0,)))
    assert other.coefficients[2] * 12 == pytest.approx(one.coefficients[2], rel=1e-9)
    assert other.log_likelihood == pytest.approx(one.log_likelihood, abs=1e-10)


def test_raw_powers_of_a_year_leave_the_prior_where_it_is() -> None:
    # ill-conditioned columns are fitted in other coordinates; the reference is fitted by statsmodels in centred ones
    rng = np.random.default_rng(5)
    year = rng.integers(1990, 2021, 80).astype(float)
    exposed = (rng.random(80) < 0.1).astype(float)
    y = np.where(exposed == 1, 1.0, rng.random(80) < 0.4).astype(float)
    raw = np.column_stack([np.ones(80), year, year**2, year**3, exposed])
    fit = maximise(LogFLikelihood(BinomialLikelihood(raw, y), (4,), 2.0))
    assert fit.space.to_beta is not None
    c = (year - 2005) / 10
    columns = np.column_stack([np.ones(80), c, c**2, c**3, exposed])
    augmented = np.vstack([columns, np.eye(5)[[4, 4]]])
    reference = sm.GLM(np.append(y, [1.0, 0]), augmented, family=sm.families.Binomial()).fit(tol=1e-14)
    assert fit.status == "converged"
    assert fit.coefficients[4] == pytest.approx(reference.params[4], rel=1e-7)
    lower, upper = profile_intervals(fit)
    height = fit.log_likelihood - 3.841458820694124 / 2
    for limit in (lower[4], upper[4]):
        # refitted with the exposure's log odds ratio held there; its prior's logarithm is a constant, added by hand
        held = sm.GLM(y, columns[:, :4], family=sm.families.Binomial(), offset=limit * exposed).fit(tol=1e-12).llf
        assert held + limit - 2 * np.log1p(np.exp(limit)) == pytest.approx(height, abs=1e-6)


def test_an_exposure_without_finite_maximum_gets_one() -> None:
    # 50 digits: the root of the score of the 2x2 table with 0, 9 and 5, 7 and a prior of m = 1 on the odds ratio
    plain = BinomialLikelihood(np.array([[1.0, 1], [1, 0]]), [0.0, 5], trials=[9.0, 12])
    assert maximise(plain).status == "no finite maximum"
    fit = maximise(LogFLikelihood(plain, (1,), 1.0))
    with mpmath.workdps(50):
        risk = lambda t: 1 / (1 + mpmath.exp(-t))  # noqa: E731
        a, b = mpmath.findroot(
            lambda a, b: [5 - 12 * risk(a) - 9 * risk(a + b), -9 * risk(a + b) + (mpmath.mpf(1) / 2 - risk(b))],
            (mpmath.mpf(float(fit.coefficients[0])), mpmath.mpf(float(fit.coefficients[1]))),
        )
    assert fit.coefficients == pytest.approx([float(a), float(b)], abs=1e-12)
    certificate = certify(fit)
    assert certificate.digits.min() > 12
    assert abs(certificate.fit.coefficients[1] - float(b)) < 1e-14 * abs(float(b)) + 1e-15


def test_a_separated_column_without_prior_is_still_said_to_be() -> None:
    X = np.array([[1.0, 0, 0], [1, 1, 0], [1, 0, 1], [1, 1, 1]])
    plain = BinomialLikelihood(X, [2.0, 0, 6, 0], trials=[5.0, 4, 9, 3])
    assert maximise(LogFLikelihood(plain, (2,), 2.0)).status == "no finite maximum"
    assert maximise(LogFLikelihood(plain, (1,), 2.0)).status == "converged"


def test_a_prior_does_not_make_an_aliased_column_estimable() -> None:
    X, y = records()
    doubled = np.column_stack([X, X[:, 1]])
    assert maximise(LogFLikelihood(BinomialLikelihood(doubled, y), (1, 3), 2.0)).status == "aliased"


def test_derivatives_against_differences_and_concavity() -> None:
    X, y = records(2, 30)
    likelihood = LogFLikelihood(BinomialLikelihood(X, y), (1, 2), 3.0, (1.0, 10.0))
    for beta in (np.zeros(3), np.array([0.5, -2.0, 0.03]), np.array([-1.0, 300.0, -0.1])):
        evaluation = likelihood.evaluate(beta)
        numeric = approx_fprime(beta, lambda b: float(likelihood.evaluate(b).log_likelihood[0]), 1e-7)
        assert evaluation.score[0] == pytest.approx(numeric, rel=1e-4, abs=1e-3)
        assert evaluation.information is not None
        hessian = approx_fprime(beta, lambda b: likelihood.evaluate(b).score[0], 1e-6)
        assert evaluation.information[0] == pytest.approx(-hessian, rel=1e-3, abs=1e-2)
        assert np.linalg.eigvalsh(evaluation.information[0])[0] > -1e-9
        exact = likelihood.extended_score(beta.astype(np.longdouble)).astype(float)
        assert evaluation.score[0] == pytest.approx(exact, rel=1e-12, abs=1e-10)


def test_a_likelihood_ratio_keeps_the_prior() -> None:
    X, y = records(7)
    likelihood = LogFLikelihood(BinomialLikelihood(X, y), (1,), 2.0)
    statistic, df, p = likelihood_ratio(maximise(likelihood), maximise(likelihood, basis=np.eye(3)[:, [0, 2]]))
    plain = maximise(BinomialLikelihood(X[:, [0, 2]], y)).log_likelihood - 2.0 * np.log(2.0)
    assert statistic == pytest.approx(2 * (maximise(likelihood).log_likelihood - plain), abs=1e-9)
    assert df == 1
    assert 0 < p < 1


def test_the_odds_ratios_of_a_prior() -> None:
    # Greenland & Mansournia 2015, quoted from memory: 1/648 to 648 for m = 1, 1/39 to 39 for m = 2
    for m, odds_ratio in ((1.0, 648), (2.0, 39)):
        lower, upper = prior_interval(m)
        assert round(upper) == odds_ratio
        assert lower * upper == pytest.approx(1.0, rel=1e-12)
    for m, level in ((0.5, 0.9), (3.0, 0.99), (40.0, 0.5)):
        assert prior_interval(m, level) == pytest.approx(
            tuple(f_distribution.ppf([0.5 - level / 2, 0.5 + level / 2], m, m)), rel=1e-8
        )


@pytest.mark.parametrize(("m", "level"), [(0.0, 0.95), (-1.0, 0.95), (np.nan, 0.95), (1e-4, 0.95), (2.0, 1.0)])
def test_no_interval_where_there_is_none(m: float, level: float) -> None:
    with pytest.raises(ValueError, match=r"above 0|written"):
        prior_interval(m, level)


@pytest.mark.parametrize(
    ("positions", "m", "per"),
    [((3,), 1.0, None), ((-1,), 1.0, None), ((1,), 0.0, None), ((1,), np.inf, None), ((1,), 1.0, (0.0,)),
     ((1,), 1.0, (np.nan,)), ((1,), 1.0, (1.0, 2.0))],
)  # fmt: skip
def test_priors_that_make_no_sense_are_refused(positions: tuple, m: float, per: tuple | None) -> None:
    X, y = records()
    with pytest.raises(ValueError, match="must be"):
        LogFLikelihood(BinomialLikelihood(X, y), positions, m, per)
