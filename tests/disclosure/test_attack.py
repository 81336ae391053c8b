"""An attacker with every number of a disclosed study and the shape of the records tries to find hidden counts.

The attacker shares nothing with the package: each shown count is one equation about the 96 cells of the joint table
(smoking × sex × age band × outcome) and the 36 of risk bands × outcome, and integer programs (scipy's HiGHS) give the
smallest and largest value of what is hidden.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.optimize import Bounds, LinearConstraint, milp

from oddsmodel.disclosure import disclose, suppression

sys.path.insert(0, str(Path(__file__).parent))
from joint_records import (
    BANDS,
    COMPLETE,
    EVENT,
    EVERYONE,
    HAS_SMOKING,
    Mask,
    bands,
    joint_table,
    smoking,
)
from sample_study import Sample, sample_study

THRESHOLD = 5


class Attacker:
    """What can be worked out about sums of cells of the joint table."""

    def __init__(self, equations: list[tuple[Mask, int]], hints: list[tuple[Mask, int, float]] = []) -> None:  # noqa: B006
        told = [(mask.astype(float), value, value) for mask, value in equations]
        told += [(mask.astype(float), low, high) for mask, low, high in hints]
        # The complete records are the same by columns and by risk band.
        for outcome, column in ((EVENT, slice(1, 2)), (~EVENT, slice(0, 1))):
            told.append((1.0 * (COMPLETE & outcome) - bands(0, BANDS, column), 0, 0))
        rows, lower, upper = zip(*told, strict=True)
        self.constraint = LinearConstraint(np.array(rows), lower, upper)

    def bounds(self, mask: Mask) -> tuple[int, int]:
        found = []
        for sign in (1.0, -1.0):
            size = mask.size
            answer = milp(
                sign * mask,
                constraints=self.constraint,
                bounds=Bounds(0, 10**6),
                integrality=np.ones(size, dtype=np.uint8),
            )
            assert answer.x is not None, answer.message
            found.append(round(sign * answer.fun))
        return found[0], found[1]


def split(sample: Sample, threshold: int) -> tuple[list[tuple[Mask, int]], dict[str, Mask]]:
    """The counts that are shown, as equations, and those that are hidden."""
    shown_study = disclose(sample.study, audience="shareable", hide_counts_below=threshold).study
    equations: list[tuple[Mask, int]] = []
    hidden: dict[str, Mask] = {}
    for name, shown, mask in sample.counts:
        value = shown(shown_study)
        if isinstance(value, int):
            assert value == sample.true(mask), name
            equations.append((mask, value))
        elif not name.startswith("calibration"):
            hidden[name] = mask
    for m, model in enumerate(shown_study.models):
        equations += told_together(sample, m, model.flow.left_out)
    return equations, hidden


def told_together(sample: Sample, m: int, left_out: object) -> list[tuple[Mask, int]]:
    """The sum of the reasons that are told together is a shown number too."""
    reasons = {one.reason for one in left_out}  # type: ignore[attr-defined]
    sums = [one.records for one in left_out if one.code == "other-reasons-together"]  # type: ignore[attr-defined]
    if not sums or sums[0] is None:
        return []
    merged = [mask for name, _, mask in sample.counts if name.startswith(f"flow {m}") and name[7:] not in reasons]
    merged = [mask for mask in merged if not (mask & HAS_SMOKING & COMPLETE).any()]
    return [(np.logical_or.reduce(merged), sums[0])]


def small_differences(joint: NDArray[np.int64]) -> dict[str, Mask]:
    """What lies between the two models, by level and outcome, where it is a small count."""
    between = HAS_SMOKING & ~COMPLETE
    found = {}
    for place in range(3):
        for outcome in (EVERYONE, EVENT, ~EVENT):
            mask = between & smoking(place) & outcome
            if 0 < joint[mask].sum() < THRESHOLD:
                found[f"between the models {place} {outcome.sum()}"] = mask
    return found


@pytest.mark.parametrize("seed", [0, 3, 17, 21, 30])
@pytest.mark.parametrize("other_records", [False, True])
def test_no_hidden_count_can_be_worked_out(seed: int, other_records: bool) -> None:
    joint = joint_table(seed)
    sample = sample_study(joint, other_records=other_records)
    equations, hidden = split(sample, THRESHOLD)
    small = {name: mask for name, mask in hidden.items() if 0 < sample.true(mask) < THRESHOLD}
    assert small
    for mask, value in equations:
        assert not 0 < value < THRESHOLD, mask

    plain = Attacker(equations)
    protected = dict(small)
    if other_records:
        protected |= small_differences(joint)
    for name, mask in protected.items():
        lowest, highest = plain.bounds(mask)
        assert lowest < highest, f"{name} is worked out: {lowest}"
        if name in small:
            assert highest >= THRESHOLD, f"{name} is known to be small"

    # A reader who is told of every hidden count whether it is small (a finding may name the levels that are).
    nothing = any(sample.true(mask) == 0 for mask in hidden.values())
    hints = [
        (mask, 0 if nothing else 1, THRESHOLD - 1.0) if sample.true(mask) < THRESHOLD else (mask, THRESHOLD, np.inf)
        for mask in hidden.values()
    ]
    hinted = Attacker(equations, hints)
    for name, mask in small.items():
        lowest, highest = hinted.bounds(mask)
        assert lowest < highest, f"{name} is worked out with hints: {lowest}"


@pytest.mark.parametrize("seed", [0, 17])
def test_nothing_more_can_be_worked_out_where_the_search_is_cut_short(
    seed: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(suppression, "MOST_WORK", 0)
    test_no_hidden_count_can_be_worked_out(seed, True)


def test_the_attacker_succeeds_without_protection() -> None:
    """The attack is one that works: with the small counts alone hidden, it finds some of them."""
    sample = sample_study(joint_table(3), other_records=False)
    equations = [(mask, n) for _, _, mask in sample.counts if not 0 < (n := sample.true(mask)) < THRESHOLD]
    small = [mask for name, _, mask in sample.counts if 0 < sample.true(mask) < THRESHOLD]
    attacker = Attacker(equations)
    found = [lowest == highest for lowest, highest in map(attacker.bounds, small)]
    assert sum(found) > 3
