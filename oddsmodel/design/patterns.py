"""Covariate patterns: records with equal rows of the model matrix, counted together."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

Array = NDArray[np.float64]
Bits = NDArray[np.uint64]

ROWS_AT_ONCE = 16_384
ODD = np.uint64(0x9E3779B97F4A7C15)
SPREAD = np.uint64(0xD6E8FEB86659FD93)
SHIFT = np.uint64(32)
HASHES = 2


@dataclass(frozen=True, slots=True)
class Patterns:
    """m covariate patterns of n records, in the order of their first record.

    X (m, p): the row of each. events (m,), trials (m,): how many of its records had the event, and how many it has.
    index (n,): the pattern of each record. first_row (m,): its first record.
    """

    X: Array
    events: Array
    trials: Array
    index: NDArray[np.intp]
    first_row: NDArray[np.intp]


def collapse(X: Array, event: NDArray[np.bool_], counts: Array | None = None) -> Patterns:
    """The patterns of a model matrix X (n, p) of finite numbers, with the events of event (n,).

    counts (n,): true frequencies; without them every row is one record. 0 and −0 are equal. Rows are told apart by a
    64-bit hash of their numbers, and every row is then compared with the pattern it was given.
    """
    index, first_row = _grouped(X)
    m = first_row.size
    weights = np.asarray(event, dtype=np.float64) if counts is None else counts * event
    events = np.asarray(np.bincount(index, weights=weights, minlength=m), dtype=np.float64)
    trials = np.asarray(np.bincount(index, weights=counts, minlength=m), dtype=np.float64)
    rows = X if m == len(X) else X[first_row]
    return Patterns(rows, events, trials, index, first_row)


def distinct_rows(X: Array) -> tuple[Bits, NDArray[np.intp], NDArray[np.intp]] | None:
    """The hash of every row (n,), its place among the distinct rows (n,), and the first row of each, in the order met.

    None where different rows share a hash.
    """
    hashes = row_hashes(X, 0)
    index = pd.factorize(hashes)[0]
    first_row = np.flatnonzero(np.diff(np.maximum.accumulate(index), prepend=-1) > 0)
    return (hashes, index, first_row) if _holds(X, index, first_row) else None


def _grouped(X: Array) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """The pattern of each row and the first row of each pattern."""
    for attempt in range(HASHES):
        index = pd.factorize(row_hashes(X, attempt))[0]
        first_row = np.flatnonzero(np.diff(np.maximum.accumulate(index), prepend=-1) > 0)
        if _holds(X, index, first_row):
            return index, first_row
    return _exactly(X)


def row_hashes(X: Array, attempt: int) -> Bits:
    """A 64-bit hash (n,) of each row of X (n, p): each number's bits are mixed with a key of its column, and added."""
    keys = _mixed(np.arange(1, X.shape[1] + 1, dtype=np.uint64) * ODD + np.uint64(attempt), SPREAD)
    hashes = np.empty(len(X), dtype=np.uint64)
    for first in range(0, len(X), ROWS_AT_ONCE):
        rows = slice(first, first + ROWS_AT_ONCE)
        # Adding 0 turns -0 into 0.
        bits = np.ascontiguousarray((X[rows] + 0.0).T).view(np.uint64)
        total = np.zeros(bits.shape[1], dtype=np.uint64)
        for column, key in zip(bits, keys, strict=True):
            total += _mixed(column ^ key, SPREAD)
        hashes[rows] = total
    return hashes


def _mixed(bits: Bits, factor: np.uint64) -> Bits:
    """Bits spread over all 64 places: fold, multiply, fold, multiply, fold (the multiplications are modulo 2^64)."""
    bits = bits ^ (bits >> SHIFT)
    bits *= factor
    bits ^= bits >> SHIFT
    bits *= factor
    bits ^= bits >> SHIFT
    return bits


def _holds(X: Array, index: NDArray[np.intp], first_row: NDArray[np.intp]) -> bool:
    """Whether every row equals the first row of its pattern."""
    own = first_row[index]
    later = np.flatnonzero(own != np.arange(len(X)))
    return all(
        np.array_equal(X[later[at : at + ROWS_AT_ONCE]], X[own[later[at : at + ROWS_AT_ONCE]]])
        for at in range(0, later.size, ROWS_AT_ONCE)
    )


def _exactly(X: Array) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """The same by sorting whole rows, for rows that share hashes."""
    _, first, inverse = np.unique(X, axis=0, return_index=True, return_inverse=True)
    order = np.argsort(first)
    rank = np.empty_like(order)
    rank[order] = np.arange(order.size)
    return rank[inverse.reshape(-1)], first[order]
