"""Box-Tidwell: whether x log x beside a number's straight line fits better, and the power that it points to."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.checks.column_fits import ColumnFit, column_fits, known_at
from oddsmodel.checks.curves import Line
from oddsmodel.checks.number_lines import Withheld, no_powers, number_lines, told_shift
from oddsmodel.checks.powers import Origin, origin
from oddsmodel.checks.spread import Spread
from oddsmodel.inference.tests import chi_square_p
from oddsmodel.likelihood.binomial import BinomialLikelihood
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.passes import Leaf
from oddsmodel.results.study import CheckResult
from oddsmodel.results.tables import Cell, Table, TableColumn
from oddsmodel.wording import say

FEWEST_EVENTS = 20

STEEP = 2.0
"""A line whose slope is fewer standard errors than this from 0 points to no power."""

FARTHEST = 10.0
"""Powers beyond this either way say only that a first step is no answer."""


@dataclass(frozen=True, slots=True)
class Added:
    """What is added of z = (x + shift) / scale: w = (z log z - level - slope z) / length, about standardised."""

    origin: Origin
    level: float
    slope: float
    length: float

    @classmethod
    def of(cls, spread: Spread) -> Added | None:
        """None where x log x is all but a straight line, or the values are no place for a logarithm."""
        where = origin(spread)
        if where is None:
            return None
        z, share = where.of(spread.values), spread.counts / spread.ends[-1]
        bent = z * np.log(z)
        away = z - share @ z
        slope = float(share @ (bent * away) / (share @ away**2))
        level = float(share @ (bent - slope * z))
        length = float(np.sqrt(share @ (bent - slope * z - level) ** 2))
        return cls(where, level, slope, length) if length > 1e-9 * float(np.sqrt(share @ bent**2)) else None

    def at(self, x: Array) -> Array:
        z = self.origin.of(x)
        return np.asarray((z * np.log(z) - self.level - self.slope * z) / self.length)


@dataclass(frozen=True, slots=True)
class WithAdded:
    """Makes rows whose matrix has a column more for each of some of its columns."""

    positions: tuple[int, ...]
    added: tuple[Added, ...]

    def __call__(self, rows: Leaf) -> Leaf:
        X = rows["X"]
        made = [one.at(X[:, position])[:, None] for position, one in zip(self.positions, self.added, strict=True)]
        return {**rows, "X": np.hstack([X, *made])}


@dataclass(frozen=True, slots=True)
class Tested:
    """The likelihood-ratio test of x log x, on one degree of freedom, and the power of a first step."""

    line: Line
    shift: float | None
    statistic: float
    p: float
    power: float | None


def check(model: FittedModel) -> CheckResult:
    """x log x beside each straight line (Box & Tidwell 1962, Technometrics 4:531-550), one line at a time.

    With b the slope of the line alone and d the coefficient of x log x, the power of a first step is 1 + d / b (their
    section 3). Where a column has values that are not positive, all of it is shifted as its `Origin` says.
    """
    reason = no_powers(model, FEWEST_EVENTS)
    tested: list[Tested] = []
    withheld: list[Withheld] = []
    if reason is None:
        lines, withheld = number_lines(model)
        tested, unfit = _test_all(model, lines)
        withheld += unfit
        reason = None if tested else "powers-no-lines"
    statistics: dict[str, float | int | None] = {
        "columns": len(tested),
        "smallest_p": min((one.p for one in tested), default=None),
    }
    unmet = say(reason, least=FEWEST_EVENTS) if reason else ""
    bent = [one.line.label for one in tested if one.p * len(tested) < 0.05]
    return CheckResult(
        name="box_tidwell",
        family="functional form",
        title=say("box-tidwell-title"),
        verdict="not applicable" if not tested else "look" if bent else "fine",
        line="",
        statistics=statistics,
        reasons={name: unmet for name, value in statistics.items() if value is None},
        tables=(_table(tested),) if tested else (),
        explanation=say(
            "box-tidwell-explanation",
            looked_at=[one.line.label for one in tested],
            bent=bent,
            withheld=[[line.label, say(code)] for line, code in withheld],
        ),
    )


def _test_all(model: FittedModel, lines: list[Line]) -> tuple[list[Tested], list[Withheld]]:
    found = [(line, Added.of(line.entered)) for line in lines]
    withheld: list[Withheld] = [(line, "powers-no-place") for line, added in found if added is None]
    kept = [(line, added) for line, added in found if added is not None]
    if not kept:
        return [], withheld
    p = len(model.design.columns)
    made = WithAdded(tuple(line.position for line, _ in kept), tuple(added for _, added in kept))
    likelihood = BinomialLikelihood.over(model.rows.passes.mapped(made), p + len(kept))
    start = np.zeros(p + len(kept))
    start[:p] = model.fit.coefficients
    fits = column_fits(likelihood, known_at(likelihood, start), [(*range(p), p + k) for k in range(len(kept))])
    tested: list[Tested] = []
    for k, ((line, added), fit) in enumerate(zip(kept, fits, strict=True)):
        if fit is None:
            withheld.append((line, "powers-not-settled"))
            continue
        statistic = max(0.0, 2.0 * (fit.log_likelihood - model.fit.log_likelihood))
        power = _power(model, line, added, fit, p + k)
        tested.append(Tested(line, told_shift(line, added.origin), statistic, chi_square_p(statistic, 1), power))
    return tested, withheld


def _power(model: FittedModel, line: Line, added: Added, fit: ColumnFit, place: int) -> float | None:
    slope, error = (float(of[line.position]) for of in (model.fit.coefficients, model.fit.standard_errors))
    if not fit.finite or abs(slope) < STEEP * error:
        return None
    power = 1.0 + float(fit.coefficients[place]) / added.length / (slope * added.origin.scale)
    return power if abs(power) <= FARTHEST else None


def _table(tested: list[Tested]) -> Table:
    notes = [say("shift-untold")] if any(one.shift is None for one in tested) else []
    notes += [say("box-tidwell-no-power")] if any(one.power is None for one in tested) else []
    columns = (
        TableColumn("column", say("form-heading-column")),
        TableColumn("shift", say("asked-form-shift"), "number"),
        TableColumn("statistic", say("form-heading-likelihood-ratio"), "number"),
        TableColumn("p", say("form-heading-p"), "p"),
        TableColumn("power", say("box-tidwell-power"), "number"),
    )
    rows: list[tuple[Cell, ...]] = [(one.line.label, one.shift, one.statistic, one.p, one.power) for one in tested]
    return Table("box_tidwell", say("box-tidwell-table"), columns, tuple(rows), " ".join(notes))
