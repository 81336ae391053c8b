"""Whether an identifier repeats, told of any number of rows by eight bytes for each of its different values."""

from __future__ import annotations

import hashlib
from collections.abc import Collection, Iterable

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray

from oddsmodel.records.arrow import as_numbers, as_texts, plain_values, what_it_holds
from oddsmodel.records.kinds import is_number
from oddsmodel.records.same_value import PLAIN_NUMBER, TRUTH
from oddsmodel.records.stream.tally import plainly_written
from oddsmodel.records.texts import clean_texts

Hashes = NDArray[np.uint64]
OFFSET, PRIME = np.uint64(14695981039346656037), np.uint64(1099511628211)
FEW = 1000
LONG = 64
"""Bytes of a text that are taken in one by one."""


class IdentityTally:
    """How many records have an identifier (`records`), and how many different ones there are (`different`).

    Texts are told apart by 64-bit hashes (Fowler, Noll & Vo 1991), so that among n of them two fall together with a
    probability of about n²/2^65; where only few seem to repeat, `check` looks at these texts themselves. not_recorded:
    keys of the texts that mean it. as_texts: whole numbers are too large for anything else. stripped, cleaned: see
    `RawColumn`.
    """

    def __init__(self, not_recorded: Collection[str], *, as_texts: bool = False) -> None:
        self.rows = self.missing = self.records = self.stripped = self.cleaned = 0
        self._not_recorded, self._as_texts = not_recorded, as_texts
        self._known: Hashes = np.empty(0, np.uint64)
        self._pending: list[Hashes] = []
        self._waiting = 0
        self._repeated: Hashes = np.empty(0, np.uint64)

    def add(self, column: pa.ChunkedArray) -> None:
        self.rows += len(column)
        self.missing += column.null_count
        hashes, _ = self._hashed(column, note=True)
        self.records += len(hashes)
        self._pending.append(hashes)
        self._waiting += len(hashes)
        if self._waiting >= len(self._known):
            self._merge()

    def add_missing(self, rows: int) -> None:
        self.rows, self.missing = self.rows + rows, self.missing + rows

    @property
    def size(self) -> int:
        return 16 * (len(self._known) + self._waiting)

    @property
    def different(self) -> int:
        self._merge()
        return len(self._known)

    def check(self, columns: Iterable[pa.ChunkedArray]) -> int:
        """The number of different ones, those that few hashes stand for counted by their texts. columns: all of the
        column again."""
        different = self.different
        if self.records == different or len(self._repeated) > FEW:
            return different
        met: set[object] = set()
        for column in columns:
            hashes, values = self._hashed(plain_values(column), note=False)
            met.update(np.asarray(values)[np.isin(hashes, self._repeated)].tolist())
        return different - len(self._repeated) + len(met)

    def _hashed(self, column: pa.ChunkedArray, *, note: bool) -> tuple[Hashes, NDArray[np.float64] | pa.Array]:
        """The hashes of the cells that hold an identifier, and these."""
        holds = what_it_holds(column.type)
        if holds in ("numbers", "whole numbers") and not self._as_texts:
            numbers = as_numbers(column) + 0.0  # one zero
            absent = [float(key) for key in self._not_recorded if is_number(key)]
            numbers = numbers[~np.isnan(numbers) & ~np.isin(numbers, absent)]
            return numbers.view(np.uint64), numbers
        texts = pa.concat_arrays([as_texts(chunk, days_only=False) for chunk in pc.drop_null(column).chunks])
        clean, had_spaces, had_unseen = clean_texts(texts)
        if note:
            self.stripped += int(had_spaces.sum())
            self.cleaned += int(had_unseen.sum())
        clean = clean.filter(pc.invert(pc.or_(pc.equal(clean, ""), pa.array(self._absent(clean)))))
        return _hashes(clean), clean

    def _absent(self, texts: pa.Array) -> NDArray[np.bool_]:
        """Which texts (k,) mean "not recorded"."""
        keys = pa.array(sorted(self._not_recorded), pa.string())
        absent = np.asarray(pc.is_in(texts, keys).to_numpy(zero_copy_only=False), dtype=np.bool_)
        numbers = [key for key in self._not_recorded if PLAIN_NUMBER.fullmatch(key)]
        if numbers:
            words = pa.array([word for word, key in TRUTH.items() if key in numbers], pa.string())
            absent |= np.isin(plainly_written(texts), [float(key) for key in numbers])
            absent |= pc.is_in(pc.utf8_lower(texts), words).to_numpy(zero_copy_only=False)
        return absent

    def _merge(self) -> None:
        if not self._pending:
            return
        everything = np.sort(np.concatenate([self._known, *self._pending]))
        again = np.zeros(len(everything), dtype=np.bool_)
        again[1:] = everything[1:] == everything[:-1]
        if len(self._repeated) <= FEW:
            repeated = everything[again][: 2 * FEW]
            self._repeated = np.unique(np.concatenate([self._repeated, repeated]))
        self._known = everything[~again]
        self._pending, self._waiting = [], 0


def _hashes(texts: pa.Array) -> Hashes:
    """A hash (k,) of each text and its length, taking in one byte of all texts at a time."""
    if len(texts) == 0:
        return np.empty(0, np.uint64)
    _, offsets, letters = texts.buffers()
    ends = np.frombuffer(offsets, dtype=np.int32)[texts.offset : texts.offset + len(texts) + 1]
    data = np.frombuffer(letters, dtype=np.uint8)
    lengths = np.diff(ends)
    order = np.argsort(-lengths, kind="stable")
    start, lengths = ends[:-1][order], lengths[order]
    mixed = np.full(len(texts), OFFSET) ^ lengths.astype(np.uint64)
    for at in range(min(int(lengths[0]), LONG)):
        within = int(np.searchsorted(-lengths, -at, side="left"))  # so many texts are longer
        mixed[:within] = (mixed[:within] ^ data[start[:within] + at]) * PRIME
    for at in range(int(np.searchsorted(-lengths, -LONG, side="left"))):
        rest = data[start[at] + LONG : start[at] + lengths[at]].tobytes()
        mixed[at] ^= np.uint64(int.from_bytes(hashlib.blake2b(rest, digest_size=8).digest(), "little"))
    hashes = np.empty_like(mixed)
    hashes[order] = mixed
    return hashes
