"""Numbers in words and figures, the same way everywhere."""

from __future__ import annotations

import math

NARROW_SPACE = "\u202f"


def count(value: int) -> str:
    """A whole number with its thousands apart: 4012 is "4 012" (with a narrow no-break space)."""
    return f"{value:,}".replace(",", NARROW_SPACE)


def ratio(value: float) -> str:
    """An odds ratio: two decimals, three below 0.1, one from 10 on, none from 100 on."""
    if not math.isfinite(value):
        raise ValueError("a ratio that is not finite must be said in words")
    if value >= 99.95:
        return count(round(value)) if value < 1e6 else f"{value:.1e}"
    if value >= 9.995:
        return f"{value:.1f}"
    if value >= 0.0995:
        return f"{value:.2f}"
    return f"{value:.3f}" if value >= 0.0005 else "under 0.001"


def interval(lower: float | None, upper: float | None) -> str:
    """Two limits as "1.21 to 1.60"; a limit that does not exist is said so."""
    if lower is None and upper is None:
        return "no finite limits"
    if lower is None:
        return f"no lower limit, up to {ratio(upper or 0.0)}"
    if upper is None:
        return f"{ratio(lower)} and above, no upper limit"
    return f"{ratio(lower)} to {ratio(upper)}"


def p_value(p: float) -> str:
    """A p-value: two decimals from 0.1 on, three below, "under 0.001"."""
    if p < 0.001:
        return "under 0.001"
    if p > 0.99:
        return "over 0.99"
    return f"{p:.2f}" if p >= 0.0995 else f"{p:.3f}"


def percent(share: float) -> str:
    """A share between 0 and 1 as "12.3%"."""
    return f"{100 * share:.1f}%"


def decimal(value: float, digits: int = 2) -> str:
    """A plain number with a true minus sign."""
    text = f"{value:.{digits}f}"
    return text.replace("-", "\u2212") if float(text) != 0 else text.replace("-", "")


def plural(number: int, one: str, many: str | None = None) -> str:
    """ "1 record", "2 records"."""
    return f"{count(number)} {one if number == 1 else (many or one + 's')}"


def listed(words: list[str] | tuple[str, ...], last: str = "and") -> str:
    """ "a", "a and b", "a, b and c"."""
    if len(words) <= 1:
        return "".join(words)
    return f"{', '.join(words[:-1])} {last} {words[-1]}"
