"""From the plan's prior to a likelihood that holds it, and what is wrong with a prior."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from oddsmodel.design.encoder import Design
from oddsmodel.errors import Fault
from oddsmodel.likelihood import BinomialLikelihood, LogFLikelihood
from oddsmodel.plan.faults import fault
from oddsmodel.plan.nearest import nearest
from oddsmodel.plan.schema import ModelSection, Prior
from oddsmodel.wording.plain import quoted


def prior_positions(columns: Sequence[str], design: Design) -> tuple[int, ...]:
    """The coefficients of the prior's columns: those that have an odds ratio of their own."""
    return tuple(
        position
        for position, column in enumerate(design.columns)
        if column.shown and len(column.sources) == 1 and column.sources[0] in columns
    )


def with_prior(likelihood: BinomialLikelihood, prior: Prior, design: Design) -> LogFLikelihood:
    """The likelihood with a log-F(m, m) prior for each coefficient of the prior's columns, per the plan's unit."""
    positions = prior_positions(prior.columns, design)
    per = tuple(design.columns[position].per for position in positions)
    return LogFLikelihood(likelihood, positions, prior.m, per)


def faults_of_prior(section: ModelSection, columns: Sequence[str]) -> Iterator[Fault]:
    """Columns of a model's prior that are not columns of its formula."""
    for name in section.prior.columns if section.prior is not None else ():
        if name not in columns:
            near = nearest(name, columns)
            yield fault(
                "prior-not-in-formula",
                _where(section),
                column=quoted(name),
                nearest=None if near is None else quoted(near),
                valid=[quoted(column) for column in columns],
                otherwise="It holds no column.",
            )


def faults_of_prior_in_design(section: ModelSection, design: Design) -> Iterator[Fault]:
    """Columns of a model's prior that have no odds ratio of their own in it."""
    for name in section.prior.columns if section.prior is not None else ():
        if not prior_positions((name,), design):
            yield fault("prior-no-odds-ratio", _where(section), column=quoted(name))


def _where(section: ModelSection) -> str:
    return f"the plan, [[models]] {quoted(section.name)} prior"
