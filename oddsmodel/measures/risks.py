"""Risks (or prevalences) of two groups, their difference and their ratio, where the design allows them."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

from oddsmodel.errors import Fault, InputFault
from oddsmodel.measures.two_by_two import vetted_cells
from oddsmodel.measures.wald import normal_quantile
from oddsmodel.results.tables import Interval
from oddsmodel.wording import say

QUANTITY = {"cohort": "risk", "trial": "risk", "cross-sectional": "prevalence"}
"""What the share of events is called in each design that has one."""

NONE = Interval(None, None)


@dataclass(frozen=True, slots=True)
class Share:
    """Events of records as a share between 0 and 1, with Wilson's interval; None where there are no records."""

    events: int
    records: int
    share: float | None
    interval: Interval


@dataclass(frozen=True, slots=True)
class Risks:
    """quantity: "risk" or "prevalence". What does not exist is None, with its reason under the name of the field."""

    quantity: str
    exposed: Share
    unexposed: Share
    difference: float | None = None
    difference_interval: Interval = NONE
    ratio: float | None = None
    ratio_interval: Interval = NONE
    reasons: Mapping[str, str] = field(default_factory=dict)


def risks(a: int, b: int, c: int, d: int, level: float = 0.95, design: str = "cohort") -> Risks:
    """Risks of the exposed (a events, b non-events) and unexposed (c, d), their difference and ratio.

    Intervals: Wilson (1927) for each risk, Newcombe (1998, Statistics in Medicine 17:873, method 10) for the
    difference, the log interval of Katz et al. (1978) for the ratio.

    Raises InputFault for a design that knows no risks (case-control), and where a cell is not a count.

    >>> answer = risks(189, 10845, 104, 10933)
    >>> round(answer.ratio, 3), round(answer.difference, 4)
    (1.818, 0.0077)
    """
    if design not in QUANTITY:
        raise InputFault(Fault(say("risks-not-in-this-design", design=design), "design", say("use-odds-ratio")))
    a, b, c, d = vetted_cells(a, b, c, d, level)
    quantity = QUANTITY[design]
    z = normal_quantile(level)
    exposed, unexposed = _share(a, a + b, z), _share(c, c + d, z)
    p1, p2 = exposed.share, unexposed.share

    # A group of nobody has no risk, and nothing to compare.
    if p1 is None or p2 is None:
        reason = say("group-of-nobody")
        names = [name for name, share in (("exposed", p1), ("unexposed", p2)) if share is None]
        reasons = dict.fromkeys([*names, "difference", "difference_interval", "ratio", "ratio_interval"], reason)
        return Risks(quantity, exposed, unexposed, reasons=reasons)

    reasons = {}
    ratio = p1 / p2 if c > 0 else None
    if ratio is None:
        reasons["ratio"] = say("risk-ratio-no-events-unexposed", quantity=quantity)
    ratio_interval = NONE
    if ratio is None or a == 0:
        reasons["ratio_interval"] = say("risk-ratio-interval-no-events", quantity=quantity)
    elif b == d == 0:
        reasons["ratio_interval"] = say("risk-ratio-interval-all-events", quantity=quantity)
    else:
        reach = z * math.sqrt(b / (a * (a + b)) + d / (c * (c + d)))
        ratio_interval = Interval(ratio * math.exp(-reach), ratio * math.exp(reach))
    return Risks(
        quantity,
        exposed,
        unexposed,
        difference=p1 - p2,
        difference_interval=_newcombe(exposed, unexposed),
        ratio=ratio,
        ratio_interval=ratio_interval,
        reasons=reasons,
    )


def _share(events: int, records: int, z: float) -> Share:
    """The share with Wilson's score interval: the p whose score test does not reject the observed share."""
    if records == 0:
        return Share(events, records, None, NONE)
    p, n = events / records, records
    centre = p + z * z / (2 * n)
    reach = z * math.sqrt(p * (1.0 - p) / n + z * z / (4 * n * n))
    whole = 1.0 + z * z / n
    lower = 0.0 if events == 0 else (centre - reach) / whole
    upper = 1.0 if events == records else (centre + reach) / whole
    return Share(events, records, p, Interval(lower, upper))


def _newcombe(one: Share, other: Share) -> Interval:
    """Limits of the difference from the two Wilson intervals (Newcombe's method 10)."""
    p1, p2 = one.share, other.share
    l1, u1, l2, u2 = one.interval.lower, one.interval.upper, other.interval.lower, other.interval.upper
    if p1 is None or p2 is None or l1 is None or u1 is None or l2 is None or u2 is None:
        return NONE
    difference = p1 - p2
    return Interval(difference - math.hypot(p1 - l1, u2 - p2), difference + math.hypot(u1 - p1, p2 - l2))
