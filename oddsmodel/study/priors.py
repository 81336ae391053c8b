"""From the plan's prior to a likelihood that holds it."""

from __future__ import annotations

from oddsmodel.design.encoder import Design
from oddsmodel.likelihood import BinomialLikelihood, LogFLikelihood
from oddsmodel.plan.schema import Prior


def prior_positions(prior: Prior, design: Design) -> tuple[int, ...]:
    """The coefficients of the prior's columns: those that have an odds ratio of their own."""
    return tuple(
        position
        for position, column in enumerate(design.columns)
        if column.shown and column.sources and column.sources[0] in prior.columns and len(column.sources) == 1
    )


def with_prior(likelihood: BinomialLikelihood, prior: Prior, design: Design) -> LogFLikelihood:
    """The likelihood with a log-F(m, m) prior for each coefficient of the prior's columns, per the plan's unit."""
    positions = prior_positions(prior, design)
    per = tuple(design.columns[position].per for position in positions)
    return LogFLikelihood(likelihood, positions, prior.m, per)
