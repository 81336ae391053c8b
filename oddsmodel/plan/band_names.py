"""How the bands of a number are called; a band holds its lower edge."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise


def band_names(edges: Sequence[float]) -> tuple[str, ...]:
    """The names of the bands between rising edges (k,): k + 1 of them, the outer ones open.

    >>> band_names([18.5, 25, 30])
    ('under 18.5', '18.5 to under 25', '25 to under 30', '30 or over')
    """
    texts = [edge_text(edge) for edge in edges]
    inner = [f"{lower} to under {upper}" for lower, upper in pairwise(texts)]
    return (f"under {texts[0]}", *inner, f"{texts[-1]} or over")


def edge_text(edge: float) -> str:
    """An edge as it is written: 25 rather than 25.0."""
    return str(int(edge)) if float(edge).is_integer() and abs(edge) < 1e15 else repr(float(edge))
