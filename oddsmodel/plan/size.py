"""Sizes of memory as a plan writes them: "2 GB"."""

from __future__ import annotations

import re

SIZE = re.compile(r"([0-9]+(?:\.[0-9]+)?) ?(MB|GB|TB)")
UNITS = {"MB": 10**6, "GB": 10**9, "TB": 10**12}
LEAST = 10**9
"""The program and its working tables take about two thirds of this, however many the records."""


def bytes_of(size: str) -> int | None:
    """Bytes of a size in MB, GB or TB (powers of a thousand); None for any other text or less than `LEAST`."""
    found = SIZE.fullmatch(size.strip())
    if found is None or len(size) > 30:
        return None
    number = int(float(found[1]) * UNITS[found[2]])
    return number if number >= LEAST else None
