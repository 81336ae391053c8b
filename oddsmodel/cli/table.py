"""`table`: the crude odds ratio of a 2×2 table from four counts."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from oddsmodel.cli.ending import DONE
from oddsmodel.cli.terminal import write
from oddsmodel.errors import Fault, InputFault
from oddsmodel.results.tables import Interval
from oddsmodel.wording import numbers, say
from oddsmodel.wording.plain import quoted

if TYPE_CHECKING:
    from oddsmodel.measures.risks import Risks, Share
    from oddsmodel.measures.two_by_two import TwoByTwo

_PART_OF_ALL = re.compile(r"\s*([0-9]{1,15})\s*/\s*([0-9]{1,15})\s*")
LOWEST_LEVEL, HIGHEST_LEVEL = 0.5, 0.999


@dataclass(frozen=True, slots=True)
class Counts:
    """What was asked for: events of all by exposure, or exposed of all by case status."""

    exposed: str | None
    unexposed: str | None
    cases: str | None
    controls: str | None


def table_command(counts: Counts, level: float) -> int:
    """Print the table as it was understood, the odds ratio with its intervals, and the risks where there are any."""
    from oddsmodel.measures.risks import risks
    from oddsmodel.measures.two_by_two import two_by_two

    followed = _is_followed(counts)
    first, second = (
        (("--exposed", counts.exposed), ("--unexposed", counts.unexposed))
        if followed
        else (("--cases", counts.cases), ("--controls", counts.controls))
    )
    (part, rest), (other_part, other_rest) = _vetted([first, second], level)

    # The four cells, events and non-events of the exposed, then of the unexposed.
    cells = (part, rest, other_part, other_rest) if followed else (part, other_part, rest, other_rest)
    answer = two_by_two(*cells, level=level)
    _write_table(cells, followed)
    _write_odds_ratios(answer)
    if followed:
        _write_risks(risks(*cells, level=level), level)
    write()
    write(say("table-crude"))
    return DONE


def _is_followed(counts: Counts) -> bool:
    """Whether the exposed and unexposed are given (true) or the cases and controls (false)."""
    from oddsmodel.plan.faults import fault

    given = [value is not None for value in (counts.exposed, counts.unexposed, counts.cases, counts.controls)]
    if given == [True, True, False, False]:
        return True
    if given == [False, False, True, True]:
        return False
    raise InputFault(fault("table-form", "oddsmodel table"))


def _vetted(given: Sequence[tuple[str, str | None]], level: float) -> list[tuple[int, int]]:
    """Each part with the rest of its whole. Raises InputFault with everything that is wrong."""
    from oddsmodel.plan.faults import fault

    faults: list[Fault] = []
    split: list[tuple[int, int]] = []
    for option, text in given:
        match = _PART_OF_ALL.fullmatch(text or "")
        if match is None:
            faults.append(fault("table-not-a-part", option, found=quoted(text or "", 40)))
            continue
        part, whole = int(match[1]), int(match[2])
        if part > whole:
            faults.append(fault("table-part-too-large", option, part=part, whole=whole))
        split.append((part, whole - part))
    if not LOWEST_LEVEL <= level <= HIGHEST_LEVEL:
        percent = 100 * LOWEST_LEVEL <= level < 100
        facts = {"found": f"{level:g}", "least": f"{LOWEST_LEVEL:g}", "most": f"{HIGHEST_LEVEL:g}"}
        if percent:
            faults.append(fault("table-level-in-percent", "--level", share=f"{level / 100:g}", **facts))
        else:
            faults.append(fault("out-of-range", "--level", **facts))
    if faults:
        raise InputFault(faults)
    return split


def _write_table(cells: tuple[int, int, int, int], followed: bool) -> None:
    a, b, c, d = cells
    columns = ("table-event", "table-no-event") if followed else ("table-cases", "table-controls")
    rows = [
        ["", *(say(code) for code in columns), say("table-all")],
        [say("table-exposed"), *_counts(a, b, a + b)],
        [say("table-unexposed"), *_counts(c, d, c + d)],
        [say("table-all"), *_counts(a + c, b + d, a + b + c + d)],
    ]
    widths = [max(len(row[position]) for row in rows) for position in range(4)]
    for label, *figures in rows:
        aligned = [figure.rjust(width) for figure, width in zip(figures, widths[1:], strict=True)]
        write("   ".join([label.ljust(widths[0]), *aligned]).rstrip())


def _counts(*values: int) -> list[str]:
    return [numbers.count(value) for value in values]


def _write_odds_ratios(answer: TwoByTwo) -> None:
    lines = _Lines(answer.reasons, f"{100 * answer.level:g}%")
    write()
    lines.number("table-sample", "odds_ratio", _ratio(answer.odds_ratio))
    lines.number("table-woolf", "woolf", _limits(answer.woolf))
    lines.number("table-conditional", "conditional", _ratio(answer.conditional))
    lines.number("table-exact", "exact", _limits(answer.exact))
    lines.number("table-exact-p", "exact_p", None if answer.exact_p is None else numbers.p_value(answer.exact_p))
    lines.number("table-mid-p", "mid_p", _limits(answer.mid_p))
    lines.number("table-mid-p-p", "mid_p_p", None if answer.mid_p_p is None else numbers.p_value(answer.mid_p_p))
    lines.reasons("exact.lower", "exact.upper", "mid_p.lower", "mid_p.upper")


def _write_risks(answer: Risks, level: float) -> None:
    lines = _Lines(answer.reasons, f"{100 * level:g}%")
    write()
    lines.number("table-risk-exposed", "exposed", _share(answer.exposed))
    lines.number("table-risk-unexposed", "unexposed", _share(answer.unexposed))
    difference = _shown(answer.difference, answer.difference_interval, _points)
    lines.number("table-risk-difference", "difference", difference)
    lines.number("table-risk-ratio", "ratio", _shown(answer.ratio, answer.ratio_interval, _ratio_or_nought))
    if answer.ratio is not None:
        lines.reasons("ratio_interval")


class _Lines:
    """Lines "name: number"; in place of a number that does not exist stands its reason, each told once in full."""

    def __init__(self, reasons: Mapping[str, str], percent: str) -> None:
        self._reasons = reasons
        self._percent = percent
        self._told: set[str] = set()

    def number(self, code: str, field: str, shown: str | None) -> None:
        if shown is None:
            reason = self._reasons[field]
            shown = say("table-same-reason") if reason in self._told else reason
            self._told.add(reason)
        write(f"{say(code, percent=self._percent)}: {shown}")

    def reasons(self, *fields: str) -> None:
        for reason in dict.fromkeys(self._reasons[field] for field in fields if field in self._reasons):
            write(reason)


def _ratio(value: float | None) -> str | None:
    return None if value is None else numbers.ratio(value)


def _ratio_or_nought(value: float) -> str:
    return "0" if value == 0 else numbers.ratio(value)


def _limits(interval: Interval) -> str | None:
    return None if interval == Interval(None, None) else numbers.interval(interval.lower, interval.upper)


def _share(share: Share) -> str | None:
    return _shown(share.share, share.interval, numbers.percent)


def _points(share: float) -> str:
    return numbers.decimal(100 * share, 1)


def _shown(value: float | None, interval: Interval, words: Callable[[float], str]) -> str | None:
    """ "20.0% (13.3% to 28.9%)", without the brackets where there are no limits."""
    if value is None:
        return None
    limits = " to ".join(words(limit) for limit in (interval.lower, interval.upper) if limit is not None)
    return f"{words(value)} ({limits})" if limits else words(value)
