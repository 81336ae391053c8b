"""The 2×2 table of a model's exposure, as a table ready for disclosure."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pandas as pd
import pytest

from oddsmodel.measures.two_by_two import two_by_two
from oddsmodel.measures.two_by_two_table import two_by_two_tables


def test_counts_and_estimates(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    records = birthwt[["smoke", "race", "age"]]
    model, _ = fitting(records, birthwt["low"], "smoke + race + age", ["smoke", "race", "age"])
    (table,) = two_by_two_tables(model)
    # Hosmer & Lemeshow 1989: 30 of 74 smokers, 29 of 115 others (counts of the open data set).
    assert table.rows[0][:4] == ("smoke: yes", 74, 30, 44)
    assert table.rows[1][:4] == ("smoke: no", 115, 29, 86)
    answer = two_by_two(30, 44, 29, 86)
    assert table.rows[2][4:] == (answer.odds_ratio, answer.woolf, None)
    assert table.rows[3][4:] == (answer.conditional, answer.exact, answer.exact_p)
    assert table.rows[4][4:] == (answer.conditional, answer.mid_p, answer.mid_p_p)
    hidden = {column.key for column in table.columns if column.hidden_with_block}
    assert hidden == {"odds_ratio", "interval", "p"}


def test_reasons_are_hidden_with_the_counts(fitting: Callable[..., Any]) -> None:
    # No event among the exposed: the sentence that says so must go where the counts go. (The model is of age alone.)
    exposed = pd.Categorical(["no"] * 30 + ["yes"] * 10, categories=["no", "yes"])
    age = np.tile(np.arange(10.0), 4)
    event = np.array(([True, False, False] * 10) + [False] * 10)
    frame = pd.DataFrame({"exposed": exposed, "age": age})
    model, _ = fitting(frame, event, "age", ["age"], design="case-control")
    from dataclasses import replace

    (table,) = two_by_two_tables(replace(model, exposures=("exposed",)))
    assert table.columns[2].heading == "Cases"
    assert table.columns[-1].hidden_with_block
    assert "a cell of the table is 0" in str(table.rows[2][-1])
    assert "no finite lower limit" in str(table.rows[3][-1])
    assert table.rows[0][-1] == ""
    assert table.rows[3][4] is None
    assert table.rows[3][6] == pytest.approx(two_by_two(0, 10, 10, 20).exact_p)
    assert "0" not in table.note


def test_the_reference_is_that_of_the_model(birthwt: pd.DataFrame, fitting: Callable[..., Any]) -> None:
    # The formula may turn the plan's reference round: the crude table must then not show the inverse.
    records = birthwt[["smoke", "age"]]
    model, _ = fitting(records, birthwt["low"], 'C(smoke, Treatment("yes")) + age', ["smoke"])
    (table,) = two_by_two_tables(model)
    assert [row[0] for row in table.rows[:2]] == ["smoke: no", "smoke: yes"]
    assert table.rows[2][4] == pytest.approx(29 * 44 / (86 * 30))
