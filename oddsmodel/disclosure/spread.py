"""One odds ratio under many choices of adjustment, without those that are withheld elsewhere."""

from __future__ import annotations

import math
from collections.abc import Collection
from dataclasses import replace

from oddsmodel.results.figures import SpreadFigure

SAME = 1e-6
"""Estimates nearer than this on the log scale are one estimate found in two ways."""


def disclosed_spread(figure: SpreadFigure, withheld: Collection[float]) -> SpreadFigure | None:
    """The figure without the estimates that are withheld; None where the reported one is."""
    logs = [math.log(value) for value in withheld if value > 0.0]

    def may_stand(value: float) -> bool:
        return all(abs(math.log(value) - log) > SAME for log in logs)

    if not may_stand(figure.reported):
        return None
    alone = figure.alone if figure.alone is not None and may_stand(figure.alone) else None
    return replace(figure, estimates=tuple(filter(may_stand, figure.estimates)), alone=alone)
