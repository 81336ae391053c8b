"""Codes that may mean "not recorded": what is asked about, and what is let be."""

from __future__ import annotations

import numpy as np
import pytest

from oddsmodel.records.suspected_codes import looks_not_recorded, suspected_codes


def suspects(*values: float | range, **piles: int) -> list[float]:
    """Suspected among the values, each met once, or as often as `piles` says ("n99" for 99, "m1" for -1)."""
    counts: dict[float, int] = {}
    for value in values:
        for single in value if isinstance(value, range) else [value]:
            counts[float(single)] = 1
    for name, count in piles.items():
        counts[float(name[1:]) * (-1 if name[0] == "m" else 1)] = count
    numbers = np.asarray(sorted(counts))
    return suspected_codes(numbers, np.asarray([counts[number] for number in numbers], dtype=np.int64))


@pytest.mark.parametrize(
    ("found", "expected"),
    [
        (suspects(1, 2, 3, 4, 5, 9), [9]),
        (suspects(0, 1, 9), [9]),
        (suspects(1, 2, 3, 8, 9), [8, 9]),
        (suspects(1, 2, 3, 4, 9, 99), [9, 99]),
        (suspects(range(18, 91), 999), [999]),
        (suspects(range(18, 91), n99=40), [99]),
        (suspects(range(18, 91), n98=12, n99=40), [98, 99]),
        (suspects(0, 1, 2, 3, m1=4), [-1]),
        (suspects(range(0, 40), m9=4, m8=2), [-9, -8]),
        (suspects(range(0, 40), -999), [-999]),
        (suspects(*np.arange(15.0, 45.0, 0.1), 99), [99]),
        (suspects(*np.arange(15.0, 45.0, 0.1), 999, -1), [-1, 999]),
    ],
)
def test_asked_about(found: list[float], expected: list[float]) -> None:
    assert found == expected


@pytest.mark.parametrize(
    "found",
    [
        suspects(range(0, 10)),
        suspects(range(1, 8)),
        suspects(range(18, 100)),
        suspects(range(60, 97), n99=2),
        suspects(*np.linspace(-3, 3, 61)),
        suspects(-3, -2, -1, 0, 1, 2, 3),
        suspects(0, 1),
        suspects(1, 9),
        suspects(9),
        suspects(),
        suspects(range(0, 1500)),
        suspects(*np.arange(0.0, 9.05, 0.1)),
    ],
)
def test_let_be(found: list[float]) -> None:
    assert found == []


def test_texts() -> None:
    assert looks_not_recorded(["NA", "n/a", "Unknown", "north", "?", "Nathan", "0"]) == ["NA", "n/a", "Unknown", "?"]
