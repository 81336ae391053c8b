"""The odds ratio of a contrast of coefficients, with its intervals, as a result of its own."""

from __future__ import annotations

from oddsmodel.inference.profile import ProfileLimits
from oddsmodel.measures.coefficients import profile_result, wald_result
from oddsmodel.measures.scale import exponential
from oddsmodel.results.study import CoefficientResult, CrudeEstimate, ProfileResult, Role
from oddsmodel.wording import say


def contrast_result(
    estimate: float,
    error: tuple[float | None, int | None],
    limits: ProfileLimits | None,
    place: int,
    level: float,
    *,
    term: str,
    role: Role,
    label: str,
    at: str | None = None,
    against: str | None = None,
    crude: CrudeEstimate | None = None,
) -> CoefficientResult:
    """exp(c'β) of a contrast c of a converged fit, from the estimate of c'β.

    error: its standard error, None where groups leave none, and the degrees of freedom of its t, None where normal.
    limits: profile limits of several contrasts on the log-odds scale, of which this is number `place`; None where the
    records have no likelihood. at, against: the level that is compared, and with what. What cannot be written as a
    number is None with its reason.
    """
    standard_error, df = error
    reasons: dict[str, str] = {}
    odds_ratio = exponential(estimate)
    if odds_ratio is None:
        reasons["odds_ratio"] = say("odds-ratio-out-of-range")
    if standard_error is None:
        reasons["standard_error"] = say("no-standard-error-of-one-group")
    if crude is not None and crude.profile is None:
        reasons["crude.profile"] = say("no-likelihood-of-grouped-records")
    profile = ProfileResult(None, None)
    if limits is None:
        reasons["profile"] = say("no-likelihood-of-grouped-records")
    else:
        profile = profile_result(limits, place, 1.0, reasons)
    return CoefficientResult(
        term=term,
        level=at,
        reference=against,
        levels=None,
        role=role,
        label=label,
        log_odds_ratio=estimate,
        standard_error=standard_error,
        odds_ratio=odds_ratio,
        wald=wald_result(estimate, standard_error, level, reasons, df),
        profile=profile,
        crude=crude,
        reasons=reasons,
    )
