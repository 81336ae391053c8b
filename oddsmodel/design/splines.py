"""Restricted cubic splines in the truncated-power basis, with knots at Harrell's quantiles."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from oddsmodel.design.weighted import weighted_quantiles

Array = NDArray[np.float64]

HARRELL_QUANTILES: dict[int, tuple[float, ...]] = {
    3: (0.10, 0.50, 0.90),
    4: (0.05, 0.35, 0.65, 0.95),
    5: (0.05, 0.275, 0.50, 0.725, 0.95),
    6: (0.05, 0.23, 0.41, 0.59, 0.77, 0.95),
    7: (0.025, 0.1833, 0.3417, 0.50, 0.6583, 0.8167, 0.975),
}
"""Harrell FE (2001), Regression Modeling Strategies, table 2.3. The values stand here from memory."""


def harrell_knots(x: ArrayLike, knots: int, counts: ArrayLike | None = None) -> Array:
    """The 3 to 7 knots of a restricted cubic spline of x (n,): its quantiles as in Harrell (2001), table 2.3.

    counts (n,): true frequencies, each value counted so often. Where many values are equal, knots may be equal too:
    the caller decides. KeyError for another number of knots.
    """
    values = np.asarray(x, dtype=np.float64)
    frequencies = None if counts is None else np.asarray(counts, dtype=np.float64)
    return weighted_quantiles(values, HARRELL_QUANTILES[knots], frequencies)


def restricted_cubic_basis(x: ArrayLike, knots: ArrayLike) -> Array:
    """The basis (n, k − 1) of a cubic spline of x (n,) with k knots t that is a straight line beyond the outermost.

    The first column is x itself; column j + 1, for j = 1 to k − 2, is

        [(x − t_j)₊³ − (x − t_{k−1})₊³ (t_k − t_j) / (t_k − t_{k−1}) + (x − t_k)₊³ (t_{k−1} − t_j) / (t_k − t_{k−1})]
        / (t_k − t_1)²,

    which has the unit of x (Devlin & Weeks 1986; Harrell 2001, equation 2.25).

    >>> restricted_cubic_basis([0.0, 1.0, 2.0, 3.0], [0.0, 1.0, 2.0])
    array([[0.  , 0.  ],
           [1.  , 0.25],
           [2.  , 1.5 ],
           [3.  , 3.  ]])
    """
    values = np.asarray(x, dtype=np.float64)
    t = np.asarray(knots, dtype=np.float64)
    first, before, last = t[0], t[-2], t[-1]
    basis = np.empty((values.size, t.size - 1))
    basis[:, 0] = values
    at_before, at_last = _cubed(values - before), _cubed(values - last)
    for j, knot in enumerate(t[:-2]):
        column = _cubed(values - knot)
        column -= at_before * ((last - knot) / (last - before))
        column += at_last * ((before - knot) / (last - before))
        basis[:, j + 1] = column / (last - first) ** 2
    return basis


def _cubed(above: Array) -> Array:
    """The cube of what is above 0, else 0."""
    positive = np.maximum(above, 0.0)
    return np.asarray(positive * positive * positive)
