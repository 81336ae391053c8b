"""How grave the finding of a check is: only a caution stands beside the answer, the rest is folded."""

from __future__ import annotations

from oddsmodel.findings import Severity
from oddsmodel.results.study import Verdict


def severity(verdict: Verdict) -> Severity:
    """The severity of the finding that goes with a verdict other than "fine"."""
    return "caution" if verdict == "caution" else "note"
