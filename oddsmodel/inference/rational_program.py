"""Non-negative combinations decided in exact arithmetic, for the few rows on which floating point is not sure."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

from oddsmodel.inference.rational import Whole, coprime, product

MOST_PIVOTS = 2000


def combination(vectors: Sequence[Whole], target: Sequence[int]) -> tuple[list[Fraction] | None, Whole | None]:
    """Weights >= 0 with sum of weight * vector = target, or else a direction g that shows that there are none.

    Exactly one of the two exists (Farkas): g has vector'g >= 0 for every vector and target'g < 0. The simplex method
    on the sum of the artificial variables, with Bland's rule, in fractions (Dantzig 1963, chapter 5; Bland 1977,
    Mathematics of Operations Research 2:103-107). (None, None) where it was not decided in `MOST_PIVOTS` steps.
    """
    size = len(target)
    turned = [-1 if one < 0 else 1 for one in target]
    columns = [[sign * one for sign, one in zip(turned, vector, strict=True)] for vector in vectors]
    # the inverse of the basis and the basic values, of artificial variables at first
    inverse = [[Fraction(int(i == j)) for j in range(size)] for i in range(size)]
    basis = [-1 - i for i in range(size)]
    values = [Fraction(abs(one)) for one in target]
    for _ in range(MOST_PIVOTS):
        price = [sum((inverse[i][k] for i in range(size) if basis[i] < 0), Fraction(0)) for k in range(size)]
        whole = coprime(price)
        entering = next((j for j, column in enumerate(columns) if product(column, whole) > 0), -1)
        if entering < 0:
            if any(values[i] for i in range(size) if basis[i] < 0):
                return None, [-sign * one for sign, one in zip(turned, whole, strict=True)]
            weights = [Fraction(0)] * len(columns)
            for i in range(size):
                if basis[i] >= 0:
                    weights[basis[i]] = values[i]
            return weights, None
        chosen = columns[entering]
        column = [sum((a * b for a, b in zip(line, chosen, strict=True) if b), Fraction(0)) for line in inverse]
        steps = [(values[i] / column[i], basis[i], i) for i in range(size) if column[i] > 0]
        leaving = min(steps)[2]
        divisor = column[leaving]
        inverse[leaving] = [one / divisor for one in inverse[leaving]]
        values[leaving] /= divisor
        for i in range(size):
            if i != leaving and column[i]:
                factor = column[i]
                inverse[i] = [a - factor * b for a, b in zip(inverse[i], inverse[leaving], strict=True)]
                values[i] -= factor * values[leaving]
        basis[leaving] = entering
    return None, None
