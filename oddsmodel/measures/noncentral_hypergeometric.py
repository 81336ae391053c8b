"""Fisher's noncentral hypergeometric distribution: one cell of a 2×2 table given its margins, in log space."""

from __future__ import annotations

import numpy as np

from oddsmodel.inference.exact.tilted import Tilted


class Conditional(Tilted):
    """The distribution of cell a given the margins of the table a, b / c, d and the log odds ratio θ.

        P(x) ∝ C(a+b, x) C(c+d, a+c−x) exp(θ x),   x from max(0, a−d) to min(a+b, a+c)   (Fisher 1935; Cornfield 1956)

    The logs of the weights are summed outwards from the observed x = a, where ratios of neighbours are near 1 for
    the odds ratios that matter, so that large tables lose no digits to differences of large log-factorials.
    All methods work on the log-odds scale. The table must have no empty margin.
    """

    def __init__(self, a: int, b: int, c: int, d: int) -> None:
        exposed, unexposed, events = a + b, c + d, a + c
        first, last = max(0, a - d), min(exposed, events)
        place = a - first

        # log P(x+1)/P(x) at θ = 0, for x from first to last - 1.
        x = np.arange(first, last, dtype=np.float64)
        step = np.log((exposed - x) / (x + 1.0) * ((events - x) / (unexposed - events + x + 1.0)))
        above = np.cumsum(step[place:])
        below = np.cumsum(-step[:place][::-1])[::-1]
        distance = np.arange(first, last + 1, dtype=np.float64) - a
        super().__init__(distance, np.concatenate([below, [0.0], above]), place)
