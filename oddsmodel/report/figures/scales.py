"""Where ticks fall: round values on a log axis of ratios, and on plain axes."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from itertools import pairwise

from oddsmodel.wording import numbers

_HALF_TENTHS = tuple(round(0.05 * step, 2) for step in range(10, 41))
_TENTHS = tuple(round(0.1 * step, 1) for step in range(3, 31))
_FAMILIAR = (0.2, 0.25, 0.3, 0.4, 0.5, 0.6, 0.8, 1.0, 1.25, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0)
_HALVES = (0.25, 0.5, 0.75, 1.0, 1.5, 2.0, 3.0, 4.0)
_ROUND = tuple(factor * 10.0**power for power in range(-6, 7) for factor in (1, 2, 5))
_THIRDS = tuple(factor * 10.0**power for power in range(-6, 7) for factor in (1, 3))
_TENS = tuple(10.0**power for power in range(-9, 10))
_THOUSANDS = tuple(10.0**power for power in range(-30, 31, 3))


def ratio_range(estimates: Iterable[float], limits: Iterable[float], *, beyond: float = 12.0) -> tuple[float, float]:
    """The range of a log axis that holds 1, every estimate, and limits as far as `beyond` times outside those."""
    inner = [1.0, *(value for value in estimates if value > 0)]
    low, high = min(inner), max(inner)
    limits = [value for value in limits if value > 0]
    low = max(min([low, *limits]), low / beyond)
    high = min(max([high, *limits]), high * beyond)
    margin = max(0.06 * math.log(high / low), math.log(1.06))
    return low / math.exp(margin), high * math.exp(margin)


def ratio_ticks(low: float, high: float, room: float, *, apart: float = 38.0) -> tuple[float, ...]:
    """Round values of a log axis from `low` to `high` over `room` units, no two nearer than `apart`."""
    span = math.log(high / low)
    for candidates in (_HALF_TENTHS, _TENTHS, _FAMILIAR, _HALVES, _ROUND, _THIRDS, _TENS, _THOUSANDS):
        inside = [value for value in candidates if low <= value <= high]
        gaps = [math.log(b / a) / span * room for a, b in pairwise(inside)]
        complete = candidates[0] <= low or inside[:1] != list(candidates[:1])
        complete = complete and (candidates[-1] >= high or inside[-1:] != list(candidates[-1:]))
        if complete and len(inside) >= 2 and min(gaps) >= apart:
            return tuple(inside)
    return (1.0,) if low <= 1.0 <= high else (low, high)


def ratio_label(value: float) -> str:
    """A tick of a ratio axis without needless zeros: "0.5", "1", "1.25", "10"."""
    text = numbers.ratio(value)
    return text.rstrip("0").rstrip(".") if "." in text and value < 100 else text


def plain_ticks(low: float, high: float, *, about: int = 5) -> tuple[float, ...]:
    """Round values of a plain axis from `low` to `high`."""
    if not high > low:
        return (low,)
    rough = (high - low) / about
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(factor * power for factor in (1, 2, 2.5, 5, 10) if factor * power >= rough * 0.999)
    first = math.ceil(low / step - 1e-9)
    last = math.floor(high / step + 1e-9)
    return tuple(round(k * step, 12) for k in range(first, last + 1))


def plain_labels(ticks: Sequence[float]) -> list[str]:
    """The ticks of a plain axis, all with as many decimals as the one that needs most."""
    digits = max((_digits(tick) for tick in ticks), default=0)
    if digits == 0:
        return [_whole(round(tick)) for tick in ticks]
    return [numbers.decimal(tick, digits) for tick in ticks]


def percent_labels(ticks: Sequence[float]) -> list[str]:
    """Shares as whole percentages where they are whole."""
    whole = all(abs(100 * tick - round(100 * tick)) < 1e-6 for tick in ticks)
    return [f"{numbers.decimal(100 * tick, 0)}%" if whole else numbers.percent(tick) for tick in ticks]


def _whole(value: int) -> str:
    """Four figures stand together, since they are often a year."""
    return (numbers.count(value) if abs(value) >= 10_000 else str(value)).replace("-", "\u2212")


def _digits(value: float) -> int:
    return next((digits for digits in range(7) if abs(value - round(value, digits)) < 1e-9 * max(1, abs(value))), 6)
