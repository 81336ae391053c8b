"""The first pass over a source: what is met in each column, and how its columns are to be read from then on."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import pyarrow as pa

from oddsmodel.errors import InputFault
from oddsmodel.progress import Progress
from oddsmodel.records.arrow import plain_values, what_it_holds
from oddsmodel.records.faults import fault, in_column
from oddsmodel.records.stream.identity import IdentityTally
from oddsmodel.records.stream.miniature import Miniature, identity_in_small, miniature
from oddsmodel.records.stream.source import Source
from oddsmodel.records.stream.tally import NumberTally, RowTally, Tally, TextTally, WrittenNumberTally

WHOLE_BOUND = 2**53
ZONED = pa.timestamp("s", "UTC"), pa.timestamp("ns", "UTC")
LADDER = [
    *(pa.int64(), pa.bool_(), pa.date32(), pa.time32("s"), pa.timestamp("s"), ZONED[0]),
    *(pa.timestamp("ns"), ZONED[1], pa.float64()),
]
"""The types that values of a text table can have, in the order in which they are tried; a text is none of them."""


@dataclass(frozen=True, slots=True)
class Wanted:
    """What must be known of a column. every_value: also of numbers however many different ones; numbers: the plan says
    that it is one of numbers; identity: no more than whether its values repeat, `identity` being the keys of the texts
    that mean "not recorded"; if_it_fits: nothing, where it does not fit into memory; asked_by: the key of the plan that
    needs all values."""

    every_value: bool = False
    numbers: bool = False
    identity: frozenset[str] | None = None
    if_it_fits: bool = False
    asked_by: str = ""


@dataclass
class _Column:
    """What a pass meets in a column. types: of the blocks, those without any value left aside. doubtful, large: see
    `Piece`."""

    wanted: Wanted
    types: list[pa.DataType] = field(default_factory=list)
    tally: Tally | None = None
    nothing: RowTally = field(default_factory=RowTally)
    doubtful: bool = False
    large: bool = False


def take_survey(
    source: Source, wanted: Mapping[str, Wanted], progress: Progress, *, memory: int
) -> tuple[Source, dict[str, Miniature]]:
    """The source with the types of its columns settled, and the columns in small. memory: bytes for what is met.

    Raises: InputFault for a file that cannot be read, and for a column whose different values do not fit.
    """
    found: dict[str, _Column] = {}
    left = list(wanted)
    while left:
        progress.stage("reading", source.blocks)
        columns = _one_pass(source, {name: wanted[name] for name in left}, found, progress, memory)
        texts = {name for name, one in columns.items() if one.doubtful or _are_no_numbers(one, source)}
        mixed = {name: _highest(one.types) for name, one in columns.items() if len(one.types) > 1 and name not in texts}
        clear = {name: one for name, one in columns.items() if name not in texts and name not in mixed}
        types = {name: one.types[0] if one.types else pa.null() for name, one in clear.items()}
        source = source.settled({**types, **mixed}, texts)
        found.update(clear)
        left = [name for name in left if name not in clear]
        if not left:
            again = source.reviewed(_texts(found))
            if again is not None:
                source, left, found = again, list(wanted), {}
    return source, {name: _in_small(source, name, found[name]) for name in wanted}


def _in_small(source: Source, name: str, one: _Column) -> Miniature:
    if one.tally is None:
        return miniature(source, name, one.nothing, None)
    one.tally.add_missing(one.nothing.rows)
    if isinstance(one.tally, IdentityTally):
        return identity_in_small(source, name, one.tally)
    return miniature(source, name, one.tally, one.types[0])


def _texts(found: Mapping[str, _Column]) -> dict[str, pa.Array]:
    """The different texts of the columns of texts."""
    known = {
        name: one.tally.different()[0]
        for name, one in found.items()
        if isinstance(one.tally, TextTally | WrittenNumberTally)
    }
    return {name: texts for name, texts in known.items() if pa.types.is_string(texts.type)}


def _one_pass(
    source: Source, wanted: Mapping[str, Wanted], known: Mapping[str, _Column], progress: Progress, memory: int
) -> dict[str, _Column]:
    columns = {name: _Column(one) for name, one in wanted.items()}
    for piece in source.pieces(list(columns)):
        for name, one in columns.items():
            one.doubtful = one.doubtful or name in piece.doubtful
            one.large = one.large or name in piece.large
            if not one.doubtful:
                _add(one, plain_values(piece.table[name]), source, name)
        _keep_to(memory, {**known, **columns}, source)
        progress.advance()
    return columns


def _add(one: _Column, values: pa.ChunkedArray, source: Source, name: str) -> None:
    if what_it_holds(values.type) == "nothing":
        one.nothing.add(values)
        return
    if values.type not in one.types:
        one.types.append(values.type)
    if len(one.types) > 1 or one.large:  # to be read again otherwise
        return
    if one.tally is None:
        one.tally = _tally_for(values.type, one.wanted, source, name)
    one.tally.add(values)


def _tally_for(kind: pa.DataType, wanted: Wanted, source: Source, name: str) -> Tally:
    holds = what_it_holds(kind)
    if wanted.identity is not None:
        return IdentityTally(wanted.identity, as_texts=source.keeps_as_texts(name))
    if holds in ("numbers", "whole numbers") and not source.keeps_as_texts(name):
        return NumberTally(keep_all=wanted.every_value)
    if holds == "texts" and wanted.numbers and not wanted.every_value:
        return WrittenNumberTally()
    return TextTally(by_dictionary=source.has_own_dictionary(name))


def _are_no_numbers(one: _Column, source: Source) -> bool:
    """Whether numbers are whole and too large to be told apart, so that texts are kept."""
    if one.large and len(one.types) == 1:
        return True
    tally = one.tally
    if not source.reads_numbers_from_texts or not isinstance(tally, NumberTally) or one.types != [pa.float64()]:
        return False
    return tally.whole and max(abs(tally.lowest), abs(tally.highest)) >= WHOLE_BOUND


def _highest(types: list[pa.DataType]) -> pa.DataType:
    """The type to try for a column whose blocks have several: the last on the ladder, a text above all."""
    if any(kind not in LADDER for kind in types):
        return pa.dictionary(pa.int32(), pa.string())
    return max(types, key=LADDER.index)


def _keep_to(memory: int, columns: Mapping[str, _Column], source: Source) -> None:
    """Keep less of the largest column where everything together takes too much.

    Raises: InputFault where all of it is needed.
    """
    sizes = {name: one.tally.size for name, one in columns.items() if one.tally is not None}
    while sum(sizes.values()) > memory:
        name = max(sizes, key=lambda one: sizes[one])
        one = columns[name]
        numbers = one.tally.numbers if isinstance(one.tally, WrittenNumberTally) else one.tally
        if isinstance(numbers, NumberTally) and numbers.shorten():
            sizes[name] = numbers.size
            continue
        if not one.wanted.if_it_fits or one.tally is None:
            told = fault("needs-memory", key) if (key := one.wanted.asked_by) else None
            raise InputFault(told or fault("too-many-values", in_column(source.name, name)))
        one.tally = RowTally(one.tally.rows, one.tally.missing)
        sizes[name] = 0
