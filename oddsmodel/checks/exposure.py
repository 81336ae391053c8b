"""What doing otherwise does to the exposure's odds ratio: the measure of whether a departure matters."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from oddsmodel.model.fitted import Array, FittedModel

MATTERS = math.log(1.10)
"""Change of the exposure's log odds ratio from which a departure is said to matter: ten per cent of the ratio."""

LARGEST_LOG = math.log(1e6)
"""Log odds ratios beyond this, either way, are no answer: the records hardly bound them."""


@dataclass(frozen=True, slots=True)
class Moved:
    """An exposure's odds ratio as reported (`before`) and as it would be otherwise (`after`)."""

    label: str
    before: float
    after: float

    @property
    def change(self) -> float:
        """Absolute change of the log odds ratio."""
        return abs(math.log(self.after / self.before))


def moved(model: FittedModel, coefficients: Array, positions: Sequence[int] | None = None) -> Moved | None:
    """The exposure's odds ratio that moves most under other coefficients (q,), q >= p, in the model's order.

    Only columns whose own odds ratio has a meaning count; None where the exposure has none.
    positions: the columns to look at, where not all of the exposure's.
    """
    found: list[Moved] = []
    for i in model.exposure_indices if positions is None else positions:
        column = model.design.columns[i]
        before = float(model.fit.coefficients[i]) * column.per
        after = float(coefficients[i]) * column.per
        if column.shown and max(abs(before), abs(after)) <= LARGEST_LOG:
            found.append(Moved(column.label, math.exp(before), math.exp(after)))
    return max(found, key=lambda one: one.change, default=None)
