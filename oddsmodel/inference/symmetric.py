"""Symmetric systems of equations, solved whatever the scales of their unknowns."""

from __future__ import annotations

import numpy as np
from scipy.linalg import LinAlgError, cho_factor, cho_solve

from oddsmodel.likelihood.base import Array


def solve(matrix: Array, right: Array) -> Array:
    """Solution of a symmetric system, scaled; the least-squares one where it is singular to working precision."""
    if matrix.shape[0] == 0:
        return np.zeros_like(right)
    scale = np.sqrt(np.maximum(np.diag(matrix), np.finfo(float).tiny))
    scaled = matrix / np.outer(scale, scale)
    scaled_right = (right.T / scale).T
    try:
        solved = cho_solve(cho_factor(scaled), scaled_right)
    except (LinAlgError, ValueError):
        solved = np.linalg.pinv(np.nan_to_num(scaled), rcond=1e-14, hermitian=True) @ scaled_right
    with np.errstate(over="ignore"):
        return np.asarray((solved.T / scale).T)
