"""Marginality (Nelder 1977): a term is tested without the terms that contain it."""

from __future__ import annotations

from typing import Protocol

from oddsmodel.design.types import DesignTerm


class HasTerms(Protocol):
    """A design, as far as its terms go."""

    @property
    def terms(self) -> tuple[DesignTerm, ...]: ...


def restricted_columns(design: HasTerms, term: DesignTerm) -> tuple[tuple[int, ...], tuple[int, ...]]:
    """The columns of the two models whose likelihoods are compared to test a term: (larger, smaller).

    larger: all columns but those of terms that contain the tested one and more. smaller: larger without its columns.
    """
    larger = tuple(
        column
        for other in design.terms
        if not (other.contains(term) and other.factors != term.factors)
        for column in range(other.start, other.stop)
    )
    tested = range(term.start, term.stop)
    return larger, tuple(column for column in larger if column not in tested)
