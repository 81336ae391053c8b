"""Profile limits of a model's contrasts, by whatever likelihood it was fitted."""

from __future__ import annotations

from collections.abc import Callable

from oddsmodel.inference.penalised_profile import profile_penalised
from oddsmodel.inference.profile import ProfileLimits, profile
from oddsmodel.model.fitted import Array, FittedModel


def profile_limits(
    model: FittedModel, contrasts: Array, *, told: Callable[[int], None] | None = None
) -> ProfileLimits | None:
    """Limits of the contrasts c'beta, the rows of `contrasts` (k, p), at the model's level on the log-odds scale.

    None where the records are grouped, so that there is no likelihood. told: as of `profile`.
    """
    if model.grouping is not None:
        return None
    if model.penalised is not None:
        return profile_penalised(model.penalised, contrasts, model.level)
    return profile(model.fit, contrasts, model.level, told=told)
