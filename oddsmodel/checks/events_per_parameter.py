"""Events per parameter: whether there are enough records of the rarer outcome for the columns fitted."""

from __future__ import annotations

from oddsmodel.checks.severity import severity
from oddsmodel.model.fitted import FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.wording import finding, say

FEW = 10.0
VERY_FEW = 5.0


def check(model: FittedModel) -> CheckResult:
    """Records of the rarer outcome for each coefficient beside the intercept.

    Ten was put forward by Peduzzi et al. 1996 (J Clin Epidemiol 49:1373-1379); Vittinghoff & McCulloch 2007
    (Am J Epidemiol 165:710-718) found five to nine often enough for confounders, and van Smeden et al. 2016
    (BMC Med Res Methodol 16:163) found no one number that holds everywhere: it is a rough guide.
    """
    parameters = sum(column.kind != "intercept" for column in model.design.columns)
    others = model.records - model.events
    ratio = min(model.events, others) / parameters if parameters else None
    facts = {"ratio": ratio, "parameters": parameters, "rarer_is_the_event": model.events <= others}
    code, verdict = _judge(ratio)
    line = say(code, **facts)
    return CheckResult(
        name="events_per_parameter",
        family="counting",
        title=say("events-per-parameter-title"),
        verdict=verdict,
        line=line,
        statistics={"events_per_parameter": ratio, "parameters": parameters},
        reasons={} if parameters else {"events_per_parameter": line},
        findings=(finding(severity(verdict), code, **facts),) if verdict in ("look", "caution") else (),
        explanation=say("events-per-parameter-explanation"),
    )


def _judge(ratio: float | None) -> tuple[str, Verdict]:
    if ratio is None:
        return "events-per-parameter-no-columns", "not applicable"
    if ratio < VERY_FEW:
        return "events-per-parameter-very-few", "caution"
    if ratio < FEW:
        return "events-per-parameter-few", "look"
    return "events-per-parameter-enough", "fine"
