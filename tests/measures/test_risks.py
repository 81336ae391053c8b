"""Risks, their difference and ratio, against published values and statsmodels."""

from __future__ import annotations

import pytest
from statsmodels.stats.contingency_tables import Table2x2
from statsmodels.stats.proportion import confint_proportions_2indep, proportion_confint

from oddsmodel.errors import InputFault
from oddsmodel.measures.risks import risks


def test_wilson_against_newcombe() -> None:
    # Newcombe 1998, Statistics in Medicine 17:857, table I, method 3 (from memory): 81/263 gives 0.2553 to 0.3662.
    share = risks(81, 263 - 81, 1, 1).exposed
    assert share.interval.lower == pytest.approx(0.2553, abs=5e-5)
    assert share.interval.upper == pytest.approx(0.3662, abs=5e-5)


def test_difference_against_newcombe() -> None:
    # Newcombe 1998, Statistics in Medicine 17:873, table II, method 10 (from memory): 56/70 - 48/80, 0.0524 to 0.3339.
    answer = risks(56, 14, 48, 32)
    assert answer.difference == pytest.approx(0.2)
    assert answer.difference_interval.lower == pytest.approx(0.0524, abs=5e-5)
    assert answer.difference_interval.upper == pytest.approx(0.3339, abs=5e-5)


@pytest.mark.parametrize("cells", [(20, 80, 10, 110), (0, 30, 4, 26), (12, 0, 3, 9)])
def test_against_statsmodels(cells: tuple[int, int, int, int]) -> None:
    a, b, c, d = cells
    answer = risks(a, b, c, d, level=0.9)
    for share, (events, records) in ((answer.exposed, (a, a + b)), (answer.unexposed, (c, c + d))):
        lower, upper = proportion_confint(events, records, alpha=0.1, method="wilson")
        assert share.interval.lower == pytest.approx(lower, abs=1e-12)
        assert share.interval.upper == pytest.approx(upper, abs=1e-12)
    lower, upper = confint_proportions_2indep(a, a + b, c, c + d, method="newcomb", compare="diff", alpha=0.1)
    assert answer.difference_interval.lower == pytest.approx(lower, abs=1e-12)
    assert answer.difference_interval.upper == pytest.approx(upper, abs=1e-12)
    if a > 0:
        reference = Table2x2([[a, b], [c, d]], shift_zeros=False)
        assert answer.ratio == pytest.approx(reference.riskratio, rel=1e-12)
        lower, upper = reference.riskratio_confint(0.1)
        assert answer.ratio_interval.lower == pytest.approx(lower, rel=1e-12)
        assert answer.ratio_interval.upper == pytest.approx(upper, rel=1e-12)
    else:
        assert answer.ratio == 0.0
        assert answer.ratio_interval.lower is None
        assert "events in both groups" in answer.reasons["ratio_interval"]


def test_no_events_among_the_unexposed() -> None:
    answer = risks(3, 7, 0, 10)
    assert answer.ratio is None
    assert set(answer.reasons) == {"ratio", "ratio_interval"}
    assert answer.difference == pytest.approx(0.3)


def test_a_group_of_nobody() -> None:
    answer = risks(3, 7, 0, 0)
    assert answer.exposed.share == pytest.approx(0.3)
    assert answer.difference is None
    assert "nobody" in answer.reasons["difference"]


def test_design_governs() -> None:
    assert risks(3, 7, 2, 8, design="cross-sectional").quantity == "prevalence"
    for design in ("case-control", "matched case-control"):
        with pytest.raises(InputFault, match="odds ratio"):
            risks(3, 7, 2, 8, design=design)


def test_everybody_had_the_event() -> None:
    # By the formula the standard error is 0: an interval from 1 to 1 would claim what five records cannot know.
    answer = risks(3, 0, 2, 0)
    assert answer.ratio == 1.0
    assert answer.ratio_interval.lower is None
    assert "Everybody" in answer.reasons["ratio_interval"]
