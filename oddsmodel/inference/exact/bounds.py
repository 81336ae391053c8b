"""What the rows not yet worked off can still add to the sums that are held fixed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.inference.exact.rows import Rows
from oddsmodel.inference.exact.whole_numbers import Whole


@dataclass(frozen=True)
class Reach:
    """Least and greatest sums (q, r + 1) that the rest adds, by the number 0..r of events left in this stratum.

    Where totals are not fixed there is one column of sums, whatever the number of events.
    """

    least: Whole
    greatest: Whole


class Rest:
    """The rows from `first` on, asked for one `first` after another."""

    def __init__(self, rows: Rows) -> None:
        self.rows = rows
        m = len(rows.trials)
        self.end = _ends(rows.stratum)
        q = rows.nuisance.shape[1]
        self._least_after = np.zeros((m + 1, q), dtype=np.int64)
        self._greatest_after = np.zeros((m + 1, q), dtype=np.int64)
        if rows.totals_fixed:
            self._sum_strata()

    def _sum_strata(self) -> None:
        """What whole strata from a row on, each with its number of events, add at least and at most."""
        first = len(self.rows.trials)
        while first > 0:
            start = first - 1
            while start > 0 and self.rows.stratum[start - 1] == self.rows.stratum[start]:
                start -= 1
            events = int(self.rows.stratum_events[self.rows.stratum[start]])
            least, greatest = self._extremes(start, first, events)
            self._least_after[start] = self._least_after[first] + least[:, -1]
            self._greatest_after[start] = self._greatest_after[first] + greatest[:, -1]
            first = start

    def trials_left(self, first: int, stratum: int) -> int:
        """Trials of this stratum from row `first` on."""
        if first == len(self.rows.trials) or self.rows.stratum[first] != stratum:
            return 0
        return int(self.rows.trials[first : self.end[first]].sum())

    def reach(self, first: int, stratum: int) -> Reach:
        """What the rows from `first` on can add while the rows before it end in `stratum`."""
        rows = self.rows
        if not rows.totals_fixed:
            products = rows.nuisance[first:] * rows.trials[first:, None]
            least, greatest = np.minimum(products, 0).sum(axis=0), np.maximum(products, 0).sum(axis=0)
            return Reach(least[:, None], greatest[:, None])
        end = int(self.end[first]) if self.trials_left(first, stratum) else first
        least, greatest = self._extremes(first, end, int(rows.stratum_events[stratum]))
        return Reach(least + self._least_after[end][:, None], greatest + self._greatest_after[end][:, None])

    def _extremes(self, first: int, end: int, most: int) -> tuple[Whole, Whole]:
        """Least and greatest sums of 0, 1, ... events among the rows first..end, of `most` events at most."""
        ordered = np.sort(np.repeat(self.rows.nuisance[first:end], self.rows.trials[first:end], axis=0), axis=0)
        zero = np.zeros((1, ordered.shape[1]), dtype=np.int64)
        least = np.concatenate([zero, np.cumsum(ordered[:most], axis=0)])
        greatest = np.concatenate([zero, np.cumsum(ordered[::-1][:most], axis=0)])
        return least.T, greatest.T


def _ends(stratum: Whole) -> Whole:
    """The row after the last one of each row's stratum."""
    last = np.append(np.flatnonzero(np.diff(stratum) != 0), len(stratum) - 1)
    return np.repeat(last + 1, np.diff(last, prepend=-1))
