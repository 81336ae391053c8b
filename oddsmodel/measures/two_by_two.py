"""The 2×2 table: odds ratio with Woolf's interval, conditional estimate with exact and mid-P limits."""

from __future__ import annotations

import math
import operator
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from oddsmodel.errors import Fault, InputFault
from oddsmodel.measures.noncentral_hypergeometric import Conditional
from oddsmodel.measures.wald import wald
from oddsmodel.results.tables import Interval
from oddsmodel.wording import say

LARGEST_SUPPORT = 200_000
"""Above so many tables with the same margins the exact limits are left out: unless a cell is small, Woolf's are the
same to all purposes."""

NONE = Interval(None, None)


@dataclass(frozen=True, slots=True)
class TwoByTwo:
    """Answers from one 2×2 table, all on the odds-ratio scale.

    a, b: events and non-events among the exposed; c, d: among the unexposed.
    odds_ratio: ad / bc. log_standard_error: sqrt(1/a + 1/b + 1/c + 1/d).
    conditional: maximum-likelihood estimate given the margins. exact, mid_p: its limits. exact_p, mid_p_p: two-sided
        p-values of an odds ratio of 1, twice the smaller tail.
    What does not exist is None; `reasons` says why under the name of the field, and for a single limit under
    "woolf.lower", "exact.upper" and so on.
    """

    a: int
    b: int
    c: int
    d: int
    level: float
    odds_ratio: float | None = None
    log_standard_error: float | None = None
    woolf: Interval = NONE
    conditional: float | None = None
    exact: Interval = NONE
    exact_p: float | None = None
    mid_p: Interval = NONE
    mid_p_p: float | None = None
    reasons: Mapping[str, str] = field(default_factory=dict)

    @property
    def cells(self) -> tuple[int, int, int, int]:
        return self.a, self.b, self.c, self.d


def two_by_two(a: int, b: int, c: int, d: int, level: float = 0.95) -> TwoByTwo:
    """All that a 2×2 table says of its odds ratio.

    a, b: events and non-events among the exposed; c, d: among the unexposed (for a case-control study a and c are
    the cases, b and d the controls). The interval of the sample odds ratio is Woolf's (1955). The conditional
    estimate and the exact limits come from the noncentral hypergeometric distribution (Cornfield 1956): each limit is
    the odds ratio at which one tail holds (1 − level) / 2; the mid-P limits count half of the observed table's
    probability (Lancaster 1961). The p-values are twice the smaller tail at an odds ratio of 1, at most 1, so that
    they agree with the limits.

    Raises InputFault where a cell is not a whole number of 0 or more, or the level is not between 0 and 1.

    >>> table = two_by_two(189, 10845, 104, 10933)       # Agresti 2002, section 2.2: heart attacks, placebo and aspirin
    >>> round(table.odds_ratio, 3), round(table.woolf.lower, 2), round(table.woolf.upper, 2)
    (1.832, 1.44, 2.33)
    """
    cells = vetted_cells(a, b, c, d, level)
    a, b, c, d = cells

    # An empty margin: the other margins alone make the table, whatever the odds ratio is.
    if 0 in (a + b, c + d, a + c, b + d):
        reason = say("two-by-two-empty-margin", margin=_empty_margin(*cells))
        names = ("odds_ratio", "log_standard_error", "woolf", "conditional", "exact", "exact_p", "mid_p", "mid_p_p")
        return TwoByTwo(*cells, level, reasons=dict.fromkeys(names, reason))

    reasons: dict[str, str] = {}
    odds_ratio, standard_error, woolf = _sample(*cells, level, reasons)

    # Too many tables share the margins: the exact answers would cost more than they tell.
    support = min(a + b, a + c) - max(0, a - d) + 1
    if support > LARGEST_SUPPORT:
        reason = say("two-by-two-too-large-for-exact", tables=support, most=LARGEST_SUPPORT)
        reasons |= dict.fromkeys(("conditional", "exact", "exact_p", "mid_p", "mid_p_p"), reason)
        return TwoByTwo(*cells, level, odds_ratio, standard_error, woolf, reasons=reasons)

    distribution = Conditional(*cells)
    estimate = distribution.estimate()
    conditional = None if estimate is None else math.exp(estimate)
    if conditional is None:
        reasons["conditional"] = reasons["odds_ratio"]
    exact = _limits(distribution, "exact", 1.0, level, reasons)
    mid_p = _limits(distribution, "mid_p", 0.5, level, reasons)
    return TwoByTwo(
        *cells,
        level,
        odds_ratio=odds_ratio,
        log_standard_error=standard_error,
        woolf=woolf,
        conditional=conditional,
        exact=exact,
        exact_p=distribution.p_doubled(1.0),
        mid_p=mid_p,
        mid_p_p=distribution.p_doubled(0.5),
        reasons=reasons,
    )


def vetted_cells(a: int, b: int, c: int, d: int, level: float) -> tuple[int, int, int, int]:
    """The cells as plain whole numbers. Raises InputFault with every cell, and the level, that cannot be used."""
    faults = []
    cells = []
    for name, value in zip("abcd", (a, b, c, d), strict=True):
        try:
            whole = -1 if isinstance(value, (bool, np.bool_)) else operator.index(value)
        except TypeError:
            whole = -1
        cells.append(whole)
        if whole < 0:
            faults.append(Fault(say("cell-not-a-count", value=str(value)), f"cell {name}", say("give-a-count")))
    if not 0.0 < level < 1.0:
        faults.append(Fault(say("level-out-of-range", value=str(level)), "level", say("give-a-level")))
    if faults:
        raise InputFault(faults)
    return cells[0], cells[1], cells[2], cells[3]


def _empty_margin(a: int, b: int, c: int, d: int) -> str:
    if a + b == 0:
        return "nobody is exposed"
    if c + d == 0:
        return "everybody is exposed"
    return "nobody has the event" if a + c == 0 else "everybody has the event"


def _sample(
    a: int, b: int, c: int, d: int, level: float, reasons: dict[str, str]
) -> tuple[float | None, float | None, Interval]:
    """The sample odds ratio, the standard error of its log, and Woolf's interval."""
    # A zero cell: the ratio is 0 or infinite, its log has no standard error.
    if 0 in (a, b, c, d):
        code = "sample-odds-ratio-zero" if 0 in (a, d) else "sample-odds-ratio-infinite"
        reasons["odds_ratio"] = say(code)
        reasons["log_standard_error"] = reasons["woolf"] = say("woolf-zero-cell")
        return None, None, NONE
    log_ratio = math.log(a) + math.log(d) - math.log(b) - math.log(c)
    standard_error = math.sqrt(1 / a + 1 / b + 1 / c + 1 / d)
    limits = wald(log_ratio, standard_error, level)
    return (a * d) / (b * c), standard_error, Interval(math.exp(limits.lower), math.exp(limits.upper))


def _limits(distribution: Conditional, name: str, share: float, level: float, reasons: dict[str, str]) -> Interval:
    tail = (1.0 - level) / 2.0
    lower = distribution.lower_limit(tail, share)
    upper = distribution.upper_limit(tail, share)
    if lower is None:
        reasons[f"{name}.lower"] = say("no-finite-lower-limit")
    if upper is None:
        reasons[f"{name}.upper"] = say("no-finite-upper-limit")
    return Interval(None if lower is None else math.exp(lower), None if upper is None else math.exp(upper))
