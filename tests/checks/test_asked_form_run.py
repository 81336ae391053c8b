"""The checks of form that a plan asks for, run with all others on real records."""

from __future__ import annotations

import json
import math
import sys
from dataclasses import asdict, replace
from pathlib import Path

from oddsmodel.checks import run_checks, speaking
from oddsmodel.plan.asked_checks import ASKED_CHECKS

sys.path.insert(0, str(Path(__file__).parent))
from form_models import birth_weights, fitted

ASKED = (
    "fractional_polynomials",
    "box_tidwell",
    "quantile_groups",
    "interactions",
    "condition_indices",
    "specification_stability",
)


def test_asked_for_and_folded() -> None:
    assert set(ASKED) <= set(ASKED_CHECKS)
    frame = birth_weights()
    plain = fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"])
    before = run_checks(plain)
    assert not {check.name for check in before} & set(ASKED)
    checks = run_checks(replace(plain, also=ASKED))
    assert speaking(checks) == speaking(before)
    found = {check.name: check for check in checks}
    for name in ASKED:
        check = found[name]
        assert check.line == ""
        assert check.title
        assert check.explanation
        assert check.verdict == "fine"
        assert set(check.reasons) >= {key for key, value in check.statistics.items() if value is None}
        assert all(math.isfinite(value) for value in check.statistics.values() if value is not None)
        assert "signific" not in json.dumps(asdict(check)).lower()
        for table in check.tables:
            assert all(len(row) == len(table.columns) for row in table.rows)


def test_grouped_records_get_reasons() -> None:
    frame = birth_weights()
    model = replace(
        fitted("smoke + age + lwt + race", frame, frame["low"] == 1, ["smoke"]), also=ASKED, grouping=object()
    )
    from oddsmodel.checks import box_tidwell, fractional_polynomials, interactions, quantile_groups

    for module in (fractional_polynomials, box_tidwell, quantile_groups, interactions):
        result = module.check(model)
        assert result.verdict == "not applicable"
        missing = [key for key, value in result.statistics.items() if value is None]
        assert missing
        assert all(result.reasons[key] for key in missing)
