"""What a file of records holds, column by column: the ground on which a starter plan is drafted."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd

from oddsmodel.findings import Finding
from oddsmodel.plan.schema import Kind
from oddsmodel.records.coding import FEW_WHOLE_NUMBERS, numbers_met
from oddsmodel.records.kinds import FEWEST_FOR_IDENTIFIER, kind_of
from oddsmodel.records.levels import code_levels, spelled_alike
from oddsmodel.records.numbers import code_number
from oddsmodel.records.raw import RawType
from oddsmodel.records.rows import RowsInOrder
from oddsmodel.records.same_value import same_value_key
from oddsmodel.records.source import read_table
from oddsmodel.records.suspected_codes import looks_not_recorded, suspected_codes
from oddsmodel.records.texts import without_texts
from oddsmodel.wording import say

MOST_LEVELS = 30


@dataclass(frozen=True, slots=True)
class ColumnSurvey:
    """One column.

    kind: as inferred. not_recorded: records with an empty cell or a text that is usually written for that.
    levels: values with their records, for a column with levels or with few whole numbers; the first 30 in order.
    different: how many different values there are. lower, upper: the range of a number column, codes left aside.
    suspected: texts and codes that may mean "not recorded", for the plan's `not_recorded`.
    questions: what the analyst has to settle, in words.
    """

    name: str
    kind: Kind
    not_recorded: int
    different: int
    levels: tuple[tuple[str, int], ...] = ()
    lower: float | None = None
    upper: float | None = None
    suspected: tuple[str, ...] = ()
    questions: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class RecordsSurvey:
    """records: rows read. columns: in the order of the file, those left out excepted (`findings` name them)."""

    source: str
    sha256: str
    records: int
    columns: tuple[ColumnSurvey, ...]
    findings: tuple[Finding, ...]


def survey(path: Path) -> RecordsSurvey:
    """A survey of every column of a file, without any plan. Raises InputFault as `read_table` does."""
    table = read_table(path)
    columns = tuple(_column(str(name), table.frame[name], table.types[str(name)]) for name in table.frame.columns)
    return RecordsSurvey(table.source, table.sha256, len(table.frame), columns, table.findings)


def _column(name: str, values: pd.Series, raw_type: RawType) -> ColumnSurvey:
    like: list[str] = []
    if isinstance(values.dtype, pd.CategoricalDtype):
        like = looks_not_recorded(values.cat.categories)
        recorded = without_texts(values, np.asarray(values.cat.categories.isin(like)))
    else:
        recorded = values
    kind = kind_of(recorded, raw_type, None)
    if kind == "number":
        return _numbers(name, recorded, like)
    return _texts(name, recorded, kind, like)


def _numbers(name: str, values: pd.Series, like: list[str]) -> ColumnSurvey:
    numbers, faults = code_number(values, (), where=name, rows=RowsInOrder())
    found, counts = numbers_met(numbers)
    finite = np.isfinite(found)
    found, counts = found[finite], counts[finite]
    codes = suspected_codes(found, counts)
    usual = found[~np.isin(found, codes)]
    suspected = [*like, *(same_value_key(code) for code in codes)]
    questions = _asked_about_suspects(suspected)
    kind: Kind = "number"
    if faults:
        questions.append(say("survey-stray-texts"))
    levels: tuple[tuple[str, int], ...] = ()
    whole = bool(np.all(usual == np.trunc(usual)))
    if 0 < len(usual) <= FEW_WHOLE_NUMBERS and whole:
        levels = tuple((same_value_key(number), int(counts[found == number][0])) for number in usual)
        questions.append(say("survey-few-whole-numbers"))
    elif whole and _is_running_number(name, numbers):
        kind = "identifier"
        questions.append(say("survey-running-number"))
    return ColumnSurvey(
        name,
        kind,
        not_recorded=int(values.isna().sum()),
        different=len(usual),
        levels=levels,
        lower=float(usual[0]) if len(usual) else None,
        upper=float(usual[-1]) if len(usual) else None,
        suspected=tuple(suspected),
        questions=tuple(questions),
    )


def _is_running_number(name: str, numbers: np.ndarray[tuple[int], np.dtype[np.float64]]) -> bool:
    """Whether whole numbers tell records apart: all different, and rising by row or called an identifier."""
    if len(numbers) < FEWEST_FOR_IDENTIFIER or np.isnan(numbers).any() or len(np.unique(numbers)) < len(numbers):
        return False
    words = name.casefold().replace("-", "_").replace(" ", "_").split("_")
    return bool(np.all(np.diff(numbers) > 0)) or bool({"id", "identifier", "nr", "number", "no"} & set(words))


def _texts(name: str, values: pd.Series, kind: Kind, like: list[str]) -> ColumnSurvey:
    not_recorded = int(values.isna().sum())
    if kind in ("identifier", "date"):
        different = int((np.bincount(np.asarray(values.cat.codes) + 1, minlength=1)[1:] > 0).sum())
        questions = [*_asked_about_suspects(like), say(f"survey-{kind}")]
        return ColumnSurvey(name, kind, not_recorded, different, suspected=tuple(like), questions=tuple(questions))
    coded = code_levels(values, (), levels=None, kind=kind)
    questions = _asked_about_suspects(like)
    alike = spelled_alike(coded.levels)
    if alike:
        questions.append(say("survey-spelled-alike", levels=alike[:10]))
    if len(coded.levels) > MOST_LEVELS:
        questions.append(say("survey-many-levels", levels=len(coded.levels)))
    if not coded.levels or not any(coded.counts):
        questions.append(say("survey-empty"))
    return ColumnSurvey(
        name,
        kind,
        not_recorded,
        len(coded.levels),
        levels=tuple(zip(coded.levels, coded.counts, strict=True))[:MOST_LEVELS],
        suspected=tuple(like),
        questions=tuple(questions),
    )


def _asked_about_suspects(suspected: list[str]) -> list[str]:
    return [say("survey-suspected", values=suspected)] if suspected else []
