"""The untidy extract: made to the byte by its script, read as meant, and stopped by the second quarter's new ward."""

from __future__ import annotations

import runpy
from pathlib import Path

import numpy as np
import pytest

from oddsmodel.errors import InputFault
from oddsmodel.study.run import run_plan

EXAMPLE = Path(__file__).parents[2] / "examples" / "untidy-extract"


def test_script_makes_both_quarters_to_the_byte(tmp_path: Path) -> None:
    script = tmp_path / "generate.py"
    script.write_bytes((EXAMPLE / "generate.py").read_bytes())
    runpy.run_path(str(script), run_name="__main__")
    for name in ("first-quarter.csv", "second-quarter.csv"):
        assert (tmp_path / name).read_bytes() == (EXAMPLE / name).read_bytes()
        assert len((EXAMPLE / name).read_bytes()) < 200_000


def test_the_odds_ratios_are_near_the_truth_that_the_script_states(tmp_path: Path) -> None:
    truth = runpy.run_path(str(EXAMPLE / "generate.py"))["TRUE_ODDS_RATIOS"]
    outcome = run_plan(EXAMPLE / "untidy.toml", into=tmp_path / "report")
    found = {one.term: one for one in outcome.results.models[0].coefficients}
    for term, odds_ratio in truth.items():
        one = found[term]
        assert one.log_odds_ratio is not None
        assert one.standard_error is not None
        assert abs(one.log_odds_ratio - np.log(odds_ratio)) < 2.6 * one.standard_error, term
    assert [one.name for one in outcome.results.derived] == [
        "age",
        "bmi_band",
        "illness",
        "parity_group",
        "side",
        "age_quarter",
    ]


def test_the_second_quarter_has_a_ward_in_no_group(tmp_path: Path) -> None:
    with pytest.raises(InputFault) as caught:
        run_plan(EXAMPLE / "untidy.toml", into=tmp_path / "report", records=EXAMPLE / "second-quarter.csv")
    assert "No group has “Birth centre”" in str(caught.value)
    plan = (EXAMPLE / "untidy.toml").read_text(encoding="utf-8").replace('["L1", "L2"]', '["L1", "L2", "Birth centre"]')
    (tmp_path / "plan.toml").write_text(plan, encoding="utf-8")
    outcome = run_plan(tmp_path / "plan.toml", records=EXAMPLE / "second-quarter.csv")
    assert not outcome.not_estimated
