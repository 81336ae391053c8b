"""The same fits and limits by statsmodels and scikit-learn."""

from __future__ import annotations

import warnings
from collections.abc import Callable

import numpy as np
import statsmodels.api as sm
from scipy.optimize import root_scalar
from scipy.stats import chi2
from sklearn.linear_model import LogisticRegression


def logit(X: np.ndarray, y: np.ndarray) -> np.ndarray:
    return np.asarray(sm.Logit(y, X).fit(disp=0, tol=1e-10).params)


def glm(X: np.ndarray, y: np.ndarray) -> np.ndarray:
    return np.asarray(sm.GLM(y, X, family=sm.families.Binomial()).fit(tol=1e-10).params)


def newton_cholesky(X: np.ndarray, y: np.ndarray) -> np.ndarray:
    model = LogisticRegression(C=np.inf, solver="newton-cholesky", fit_intercept=False, tol=1e-8)
    return np.asarray(model.fit(X, y).coef_[0])


def lbfgs(X: np.ndarray, y: np.ndarray) -> np.ndarray:
    model = LogisticRegression(C=np.inf, solver="lbfgs", fit_intercept=False, tol=1e-9, max_iter=10_000)
    with warnings.catch_warnings():
        # it cannot always tell that it has arrived; how near it came is measured
        warnings.simplefilter("ignore")
        return np.asarray(model.fit(X, y).coef_[0])


FITS: dict[str, Callable[[np.ndarray, np.ndarray], np.ndarray]] = {
    "statsmodels Logit": logit,
    "statsmodels GLM": glm,
    "scikit-learn newton-cholesky": newton_cholesky,
    "scikit-learn lbfgs": lbfgs,
}


def limit_by_refitting(
    X: np.ndarray, y: np.ndarray, estimate: np.ndarray, standard_error: float, height: float, j: int, sign: float
) -> float:
    """A profile limit of coefficient j: the root of the log-likelihood maximised over the others, less its height.

    Each trial value is an offset of a statsmodels Logit fit of the other columns, begun from the fit before. The
    secant method begins at the Wald limit, so that few refits are needed: four or five where rows are many.
    """
    others = np.delete(X, j, axis=1)
    start = np.delete(estimate, j)

    def above(theta: float) -> float:
        nonlocal start
        fit = sm.Logit(y, others, offset=theta * X[:, j]).fit(start_params=start, disp=0, tol=1e-10)
        start = np.asarray(fit.params)
        return float(fit.llf) - height

    wald = estimate[j] + sign * np.sqrt(chi2.ppf(0.95, 1)) * standard_error
    return float(root_scalar(above, x0=wald, x1=wald + 0.01 * sign * standard_error, xtol=1e-7 * standard_error).root)
