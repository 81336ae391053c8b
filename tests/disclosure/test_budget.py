"""Counts that hang together closely are hidden in bounded work, and then more of them rather than fewer."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

from oddsmodel.disclosure import disclose, suppression
from oddsmodel.disclosure.suppression import Suppression

sys.path.insert(0, str(Path(__file__).parent))
from joint_records import joint_table
from sample_study import sample_study


def test_without_time_to_search_the_whole_family_is_hidden(monkeypatch: pytest.MonkeyPatch) -> None:
    study = sample_study(joint_table(3)).study
    found = disclose(study, audience="shareable", hide_counts_below=5)
    asked: list[int] = []
    hide = Suppression._hide_the_family

    def told(self: Suppression, failing: list[int]) -> None:
        asked.extend(failing)
        hide(self, failing)

    monkeypatch.setattr(Suppression, "_hide_the_family", told)
    monkeypatch.setattr(suppression, "MOST_WORK", 0)
    hurried = disclose(study, audience="shareable", hide_counts_below=5)
    assert asked
    assert hurried.hidden_cells >= found.hidden_cells
