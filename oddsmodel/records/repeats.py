"""One record a person: which of several is used, and which are left out."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from oddsmodel.errors import InputFault
from oddsmodel.findings import Finding
from oddsmodel.plan.schema import Repeats as RepeatsSection
from oddsmodel.records.condition import vet_condition
from oddsmodel.records.faults import fault
from oddsmodel.records.made_outcome import Table
from oddsmodel.records.types import LeftOut
from oddsmodel.wording import finding
from oddsmodel.wording.plain import quoted

Mask = NDArray[np.bool_]
Codes = NDArray[np.intp]


@dataclass(frozen=True, slots=True)
class Repeats:
    """What the choice of one record a person comes to; masks (n,).

    no_person: kept records without a person. undecided: all kept records of a person with several, one of which has no
    place in the order. others: records beside the one that is used. alike: of these, records with the place in the
    order of the one that is used and the same values. differing: records with that place in the order and other
    values, so that it cannot be told which to use.
    """

    no_person: Mask
    undecided: Mask
    others: Mask
    alike: Mask
    differing: Mask


def choose(
    person: Codes, order: NDArray[np.float64], kept: Mask, *, last: bool, values: Sequence[pd.Series]
) -> Repeats:
    """The first (or last) of each person's kept records.

    person (n,): a code from 0 up, -1 where not recorded. order (n,): NaN where not recorded. values: the columns by
    which records with the same place in the order are told apart; of records alike in all, the first in the file is
    used.
    """
    n, people = len(person), int(person.max(initial=-1)) + 1
    rows = np.flatnonzero(kept & (person >= 0))
    who = person[rows]
    several = np.bincount(who, minlength=people)[who] > 1
    place = np.where(several, -order[rows] if last else order[rows], 0.0)
    unknown = np.bincount(who, weights=np.isnan(place), minlength=people)[who] > 0

    best = np.full(people, np.inf)
    np.minimum.at(best, who[~unknown], place[~unknown])
    at_best = ~unknown & (place == best[who])
    used = np.full(people, n, dtype=np.intp)
    np.minimum.at(used, who[at_best], rows[at_best])

    tied = at_best & (rows != used[who])
    same = _same(values, rows[tied], used[who[tied]])
    return Repeats(
        no_person=kept & (person < 0),
        undecided=_mask(n, rows[unknown]),
        others=_mask(n, rows[~unknown & (rows != used[who])]),
        alike=_mask(n, rows[tied][same]),
        differing=_mask(n, rows[tied][~same]),
    )


def _same(values: Sequence[pd.Series], rows: Codes, others: Codes) -> Mask:
    """Whether the rows (m,) have the values of the others (m,); two that are not recorded are the same."""
    same = np.ones(len(rows), dtype=np.bool_)
    for series in values:
        one, other = series.take(rows).reset_index(drop=True), series.take(others).reset_index(drop=True)
        equal = (one == other).to_numpy(dtype=np.bool_) | (one.isna() & other.isna()).to_numpy(dtype=np.bool_)
        same &= equal
    return same


def _mask(n: int, rows: Codes) -> Mask:
    mask = np.zeros(n, dtype=np.bool_)
    mask[rows] = True
    return mask


def repeats_left_out(
    table: Table, repeats: RepeatsSection, keep: str | None, used: Collection[str]
) -> tuple[dict[str, LeftOut], tuple[Finding, ...]]:
    """The rows that `choose` leaves out, by reason, and what is to be said of records alike.

    keep: the condition of the study, which a record must fulfil to be one of its person's. used: the columns that the
    plan has a use for.

    Raises: InputFault where the order holds neither dates nor numbers, and where records that share their place in it
        differ in a column used.
    """
    person, order = table.columns[repeats.of].label, table.columns[repeats.ordered_by].label
    kept = np.ones(len(table.frame), dtype=np.bool_)
    if keep is not None:
        kept, _ = vet_condition(keep, table.columns, "the plan, [records] keep").evaluate(table.frame, table.outside)
    codes = np.asarray(pd.factorize(table.frame[repeats.of])[0], dtype=np.intp)
    values = [table.frame[name] for name in table.frame.columns if name in used]
    found = choose(codes, _order(table, repeats.ordered_by), kept, last=repeats.use == "last", values=values)
    if found.differing.any():
        rows = np.flatnonzero(found.differing)
        facts = {
            "persons": len(np.unique(codes[rows])),
            "person": person,
            "use": repeats.use,
            "rows": table.rows.first(rows)[0],
            "total": len(rows),
        }
        raise InputFault(fault("repeats-tied", table.where(repeats.ordered_by), **facts))
    facts = {"person": person, "order": order, "use": repeats.use}
    left_out = {
        "person-not-recorded": LeftOut(found.no_person, facts),
        "repeat-undecided": LeftOut(found.undecided, facts),
        "repeat": LeftOut(found.others, facts),
    }
    alike = int(found.alike.sum())
    said = (finding("note", "repeats-alike", records=alike, order=order, person=person),) if alike else ()
    return left_out, said


def _order(table: Table, name: str) -> NDArray[np.float64]:
    if table.columns[name].kind == "number":
        return table.frame[name].to_numpy(dtype=np.float64)
    if table.columns[name].kind != "date":
        raise InputFault(fault("order-not-readable", table.where(name), column=quoted(name)))
    return table.days(name)
