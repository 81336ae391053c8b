"""Counts of successive results side by side: a difference between two of them is a count of people itself."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

Counts = Sequence[int | None]
Withheld = Literal["near", "with"]


@dataclass(frozen=True, slots=True)
class CountRow:
    """One count over the results, None where a result withholds it.

    part_of: the row that these are a part of (events of records), whose other part is protected with it.
    total: whether the rows marked `summand` and this one add up: in each result this is the sum of those.
    """

    label: str
    counts: tuple[int | None, ...]
    part_of: int | None = None
    role: Literal["", "total", "summand"] = ""


def withheld_differences(rows: Sequence[CountRow], threshold: int) -> dict[tuple[int, int], Withheld]:
    """Which counts (row, column) are not shown, so that no difference under `threshold` can be worked out.

    "near": the count, or the rest of the count it is a part of, lies less than `threshold` from one shown earlier in
    its row (equal ones among them, so that nobody learns which it is). "with": the count would give one of these
    away, as the last unknown of a sum or because the same counts stand in another row.
    """
    withheld: dict[tuple[int, int], Withheld] = {}
    if threshold < 2:
        return withheld
    for r, row in enumerate(rows):
        for c in _near(row.counts, threshold):
            withheld[r, c] = "near"
    for r, row in enumerate(rows):
        if row.part_of is not None:
            whole = rows[row.part_of].counts
            rest = [
                None if part is None or all_ is None else all_ - part
                for part, all_ in zip(row.counts, whole, strict=True)
            ]
            for c in _near(rest, threshold):
                withheld.setdefault((r, c), "near")
    before = -1
    while len(withheld) > before:
        before = len(withheld)
        _last_unknowns(rows, withheld)
        _same_counts(rows, withheld)
    return withheld


def _near(counts: Counts, threshold: int) -> list[int]:
    """The columns whose count lies within the threshold of one that stays shown before it."""
    shown: list[int] = []
    near = []
    for c, count in enumerate(counts):
        if count is None:
            continue
        if any(abs(count - other) < threshold for other in shown):
            near.append(c)
        else:
            shown.append(count)
    return near


def _last_unknowns(rows: Sequence[CountRow], withheld: dict[tuple[int, int], Withheld]) -> None:
    """Where one count of a sum is withheld alone, another goes with it: the smallest summand, else the total."""
    added = [r for r, row in enumerate(rows) if row.role]
    for c in range(len(rows[0].counts) if rows else 0):
        unknown = [r for r in added if (r, c) in withheld or rows[r].counts[c] is None]
        if len(unknown) == 1 and (unknown[0], c) in withheld:
            # A summand of zero is told by its absence: withholding it protects nothing.
            known = [r for r in added if r not in unknown and rows[r].counts[c]]
            if known:
                chosen = min(known, key=lambda r: (rows[r].role == "total", rows[r].counts[c] or 0))
                withheld[chosen, c] = "with"


def _same_counts(rows: Sequence[CountRow], withheld: dict[tuple[int, int], Withheld]) -> None:
    """What is withheld in one row is withheld in every row that holds the same counts."""
    for r, c in list(withheld):
        for other, row in enumerate(rows):
            if row.counts == rows[r].counts:
                withheld.setdefault((other, c), "with")
