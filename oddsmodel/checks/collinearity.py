"""Collinearity: how much wider each part's standard errors are for its overlap with the rest of the model."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from oddsmodel.design.constant import indicators_of_all_levels
from oddsmodel.model.fitted import Array, FittedModel
from oddsmodel.results.study import CheckResult, Verdict
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import finding, say
from oddsmodel.wording.numbers import listed

NOTABLE = 2.0
STRONG = 10.0**0.5
"""Factors of the standard error. A variance inflated tenfold is the usual warning (Marquardt 1970)."""

LEAST_SHARE = 1e-13
"""A part of which less than this is its own, outside the span of the rest, has no inflation that can be trusted."""


@dataclass(frozen=True, slots=True)
class Part:
    """Terms that share record columns, taken together; `positions` are their columns among the coefficients.

    contrasts: how many there are beside the constant: one fewer where the part's indicators of all levels hold it.
    inflation: the generalised variance inflation factor; None where the part is all but a combination of the rest.
    """

    label: str
    positions: tuple[int, ...]
    exposure: bool
    contrasts: int
    inflation: float | None

    @property
    def widening(self) -> float:
        """Factor by which the standard errors are wider, on average over the part's columns; infinite for None."""
        return float("inf") if self.inflation is None else float(self.inflation ** (0.5 / self.contrasts))


def check(model: FittedModel) -> CheckResult:
    """Generalised variance inflation of the exposure's columns and of each part of the adjustment."""
    parts = inflation_by_part(model)
    exposed = [part for part in parts if part.exposure]
    if len(parts) < 2 or not exposed:
        line = say("collinearity-one-part" if len(parts) < 2 else "collinearity-no-exposure")
        return CheckResult(
            name="collinearity",
            family="collinearity",
            title=say("collinearity-title"),
            verdict="not applicable",
            line=line,
            statistics={"exposure_standard_error_factor": None, "largest_standard_error_factor": None},
            reasons={"exposure_standard_error_factor": line, "largest_standard_error_factor": line},
            explanation=say("collinearity-explanation"),
        )
    exposure = max(exposed, key=lambda part: part.widening)
    largest = max(parts, key=lambda part: part.widening)
    tied = [part.label for part in parts if not part.exposure and part.widening >= STRONG]
    factor = _finite(exposure)
    facts = {"exposure": exposure.label, "factor": factor, "adjustment": tied}
    verdict: Verdict = "caution" if exposure.widening >= STRONG else "look" if exposure.widening >= NOTABLE else "fine"
    findings = []
    if exposure.widening >= NOTABLE:
        findings.append(finding("caution", "collinearity-exposure", **facts))
    elif tied:
        findings.append(finding("note", "collinearity-adjustment", **facts))
    statistics = {"exposure_standard_error_factor": factor, "largest_standard_error_factor": _finite(largest)}
    return CheckResult(
        name="collinearity",
        family="collinearity",
        title=say("collinearity-title"),
        verdict=verdict,
        line=say("collinearity-line", **facts),
        statistics=statistics,
        reasons={name: say("collinearity-no-number") for name, value in statistics.items() if value is None},
        findings=tuple(findings),
        tables=(_table(parts),),
        explanation=say("collinearity-explanation"),
    )


def inflation_by_part(model: FittedModel) -> tuple[Part, ...]:
    """Generalised variance inflation (Fox & Monette 1992, J Am Stat Assoc 87:178-183), part by part.

    With R the correlation matrix of the estimates without the intercept, R_1 that of a part, R_2 of the rest,

        inflation = det(R_1) det(R_2) / det(R) = 1 / product of (1 - rho^2),

    rho being the canonical correlations of the part with the rest, centred and weighted as at the maximum. They are
    found from a square root of the information in well-conditioned coordinates, so that raw powers of a
    calendar year do no harm. A term and those that share a record column with it (powers, splines, interactions)
    are one part: their overlap with each other says nothing about the overlap with other columns. Where the formula
    has no intercept but an indicator for every level of a column, their sum is the constant, and is taken off.
    """
    space = model.fit.space
    root = np.asarray(np.linalg.cholesky(model.fit.working_information).T, dtype=np.float64)
    if space.from_beta is not None:
        root = root @ space.from_beta
    columns = model.design.columns
    ones = indicators_of_all_levels(model.design)
    constant = list(ones) or [i for i, column in enumerate(columns) if column.kind == "intercept"]
    if constant:
        root = root - _projected(root[:, constant].sum(axis=1, keepdims=True), root)
    spare = set(ones[:1])
    parts: list[Part] = []
    members = _parts(model)
    everything = [i for positions in members.values() for i in positions]
    for sources, positions in members.items():
        rest = [i for i in everything if i not in positions and i not in spare]
        own = [i for i in positions if i not in spare]
        if not own:
            continue
        parts.append(
            Part(
                label=listed([model.columns[name].label if name in model.columns else name for name in sources]),
                positions=positions,
                exposure=any(columns[i].role == "exposure" for i in positions),
                contrasts=len(own),
                inflation=_inflation(root[:, own], root[:, rest]),
            )
        )
    return tuple(parts)


def _parts(model: FittedModel) -> dict[tuple[str, ...], tuple[int, ...]]:
    """Positions of the columns of terms joined by shared record columns, under those record columns, in order."""
    columns = model.design.columns
    order = list(dict.fromkeys(source for column in columns for source in column.sources))
    joined: list[tuple[set[str], set[int]]] = []
    for i, column in enumerate(columns):
        if column.kind == "intercept":
            continue
        names, positions = set(column.sources), {i}
        apart = []
        for other in joined:
            if other[0] & names:
                names, positions = names | other[0], positions | other[1]
            else:
                apart.append(other)
        joined = [*apart, (names, positions)]
    joined.sort(key=lambda one: min(one[1]))
    return {tuple(sorted(names, key=order.index)): tuple(sorted(positions)) for names, positions in joined}


def _projected(onto: Array, vectors: Array) -> Array:
    basis = _basis(onto)
    return np.asarray(basis @ (basis.T @ vectors))


def _basis(vectors: Array) -> Array:
    length = np.sqrt((vectors**2).sum(axis=0))
    return np.asarray(np.linalg.qr(vectors / length)[0])


def _inflation(part: Array, rest: Array) -> float | None:
    correlations = np.linalg.svd(_basis(part).T @ _basis(rest), compute_uv=False)
    own = 1.0 - np.minimum(correlations, 1.0) ** 2
    if own.size and own.min() < LEAST_SHARE:
        return None
    return float(np.exp(-np.log(own).sum()))


def _finite(part: Part) -> float | None:
    return None if part.inflation is None else part.widening


def _table(parts: tuple[Part, ...]) -> Table:
    return Table(
        id="collinearity",
        title=say("collinearity-table"),
        columns=(
            TableColumn("part", say("form-heading-part")),
            TableColumn("columns", say("form-heading-coefficients"), "number"),
            TableColumn("inflation", say("form-heading-inflation"), "number"),
            TableColumn("factor", say("form-heading-standard-error-factor"), "number"),
        ),
        rows=tuple((part.label, len(part.positions), part.inflation, _finite(part)) for part in parts),
    )
