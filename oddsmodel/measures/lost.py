"""Records without an outcome because they were not followed to the end of the window, by exposure."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.findings import Finding
from oddsmodel.measures.groups import groups_of_study
from oddsmodel.records.types import Column
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import finding, say

Mask = NDArray[np.bool_]
MOST_LOST = 0.05
"""Above this share lost, a time-to-event analysis is advised: it uses the time that the lost were observed."""


@dataclass(frozen=True, slots=True)
class Followed:
    """The records (n) that belong to the study and whose window could have finished.

    frame: their coded columns. lost (n,): whether the outcome is not recorded. complete (n,): whether all columns of
    the model are recorded, the outcome aside. counts (n,): true frequencies, or None.
    """

    frame: pd.DataFrame
    lost: Mask
    complete: Mask
    counts: NDArray[np.float64] | None = None

    def records(self, rows: Mask) -> int:
        return int(rows.sum() if self.counts is None else round(self.counts[rows].sum()))


def lost_by_exposure(
    followed: Callable[[str], Followed], columns: Mapping[str, Column], exposures: Sequence[str]
) -> Table:
    """Records and losses at the levels of each exposure, or in its thirds for a number.

    The rows of the levels are of records complete but for the outcome, so that those not lost are the ones analysed;
    the others stand together in a row of their own. The sum of the losses is the accounting's.
    followed: the records, whole or counted by an exposure.
    """
    rows: list[tuple[Cell, ...]] = []
    blocks: list[int] = []
    for block, name in enumerate(exposures):
        column, found = columns[name], followed(name)
        own = found.frame.loc[found.complete].reset_index(drop=True)
        counts = None if found.counts is None else found.counts[found.complete]
        groups = groups_of_study("cohort", column, own, np.zeros(len(own), dtype=np.bool_), counts)
        codes = np.full(len(found.lost), -1, dtype=np.int64)
        codes[found.complete] = groups.codes
        labels = (*(f"{column.label}: {label}" for label in groups.labels), say("lost-others"))
        for code, label in zip([*range(len(groups.labels)), -1], labels, strict=True):
            here = codes == code
            records, lost = found.records(here), found.records(here & found.lost)
            if records:
                rows.append((label, records, lost, lost / records))
                blocks.append(block)
    heads = (
        TableColumn("label", say("lost-exposure")),
        TableColumn("records", say("lost-records"), "count", sums_known=True),
        TableColumn("lost", say("lost-lost"), "count", part_of="records", sums_known=True),
        TableColumn("share", say("lost-share"), "percent", hidden_with=("records", "lost")),
    )
    return Table("lost", say("lost-title"), heads, tuple(rows), say("lost-note"), tuple(blocks), aside=True)


def lost_findings(followed: Followed) -> tuple[Finding, ...]:
    """Above 5% lost: the caution that advises a time-to-event analysis."""
    records = followed.records(np.ones_like(followed.lost))
    lost = followed.records(followed.lost)
    if not records or lost / records <= MOST_LOST:
        return ()
    share = round(lost / records, 6)
    return (finding("caution", "many-lost", lost_records=lost, followed_records=records, share=share),)
