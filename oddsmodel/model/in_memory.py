"""Rows of a model whose records are in memory."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.design.encoder import Design
from oddsmodel.design.patterns import Patterns, collapse
from oddsmodel.model.rows import COLUMN, Array, Levels, ModelRows, rows_of
from oddsmodel.passes import MemoryPasses


def people_in_memory(
    frame: pd.DataFrame, event: NDArray[np.bool_], counts: Array | None, names: Sequence[str]
) -> tuple[MemoryPasses, Levels]:
    """A pass over records (n) with the columns named, and the levels of those that have any.

    frame: coded columns. event (n,): whether the event happened. counts (n,): true frequencies, or None.
    """
    arrays: dict[str, NDArray[Any]] = {"event": np.asarray(event, dtype=np.bool_)}
    if counts is not None:
        arrays["count"] = counts
    levels: dict[str, tuple[str, ...]] = {}
    for name in names:
        values = frame[name]
        if pd.api.types.is_float_dtype(values.dtype):
            arrays[COLUMN + name] = values.to_numpy(dtype=np.float64)
            continue
        categorical = values.array if isinstance(values.dtype, pd.CategoricalDtype) else pd.Categorical(values)
        arrays[COLUMN + name] = np.asarray(categorical.codes)
        levels[name] = tuple(str(level) for level in categorical.categories)
    return MemoryPasses(arrays), levels


def rows_in_memory(
    frame: pd.DataFrame, event: NDArray[np.bool_], counts: Array | None, design: Design, names: Sequence[str]
) -> ModelRows:
    """The rows of a design for records in a frame; names: the record columns that the model is made of."""
    people, levels = people_in_memory(frame, event, counts, names)
    return rows_of(people, design, levels)


def rows_with_index(
    frame: pd.DataFrame, event: NDArray[np.bool_], counts: Array | None, design: Design, names: Sequence[str]
) -> tuple[ModelRows, Patterns]:
    """The same, always as patterns, with the pattern of each record: for records that belong to groups."""
    people, levels = people_in_memory(frame, event, counts, names)
    patterns = collapse(design.encode(frame), np.asarray(event, dtype=np.bool_), counts)
    arrays: dict[str, NDArray[Any]] = {"X": patterns.X, "events": patterns.events}
    if not (patterns.trials == 1.0).all():
        arrays["trials"] = patterns.trials
    first_row = patterns.first_row.astype(np.int64)
    return ModelRows(MemoryPasses(arrays), False, first_row, people, levels), patterns
