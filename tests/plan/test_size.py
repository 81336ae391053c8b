"""Sizes of memory in a plan."""

from __future__ import annotations

import pytest

from oddsmodel.plan.size import bytes_of


@pytest.mark.parametrize(
    ("text", "size"),
    [("2 GB", 2 * 10**9), ("1.5GB", 1_500_000_000), ("1000 MB", 10**9), ("1 TB", 10**12), (" 2 GB ", 2 * 10**9)],
)
def test_sizes(text: str, size: int) -> None:
    assert bytes_of(text) == size


@pytest.mark.parametrize(
    "text", ["", "2", "GB", "two GB", "-2 GB", "999 MB", "2 gb", "2 GiB", "1e3 GB", "9" * 40 + " GB"]
)
def test_no_sizes(text: str) -> None:
    assert bytes_of(text) is None
