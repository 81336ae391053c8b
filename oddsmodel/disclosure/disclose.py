"""The one way from results as computed to results that may leave."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace

from oddsmodel.disclosure.findings import Withheld, disclosed_finding
from oddsmodel.disclosure.flow import disclosed_exclusions
from oddsmodel.disclosure.gather import analysed_and_events, closed_models, gather
from oddsmodel.disclosure.hiding import Hiding
from oddsmodel.disclosure.model import (
    crude_numbers,
    disclosed_estimates_figure,
    disclosed_model,
    estimate_numbers,
    finding_numbers,
    gives_all_away,
    hidden_averages,
    hidden_crude,
)
from oddsmodel.disclosure.suppression import Suppression
from oddsmodel.disclosure.system import Place
from oddsmodel.disclosure.table_counts import count_cells
from oddsmodel.disclosure.tables import disclosed_table, hidden_estimates
from oddsmodel.results.figures import EstimatesFigure
from oddsmodel.results.study import DisclosedResults, ModelResult, RecordsResult, StudyResults
from oddsmodel.results.tables import Table


def disclose(study: StudyResults, *, audience: str, hide_counts_below: int) -> DisclosedResults:
    """What of a study's results may be shown to an audience.

    An audience "internal" sees everything. For any other the report is shareable:

    - counts between 0 and `hide_counts_below` are hidden in every table, flow and finding, and with them as many
      others as it takes to protect them (`Suppression` states when a count is protected);
    - shares, crude estimates and likelihoods that would give a hidden count away are hidden too;
    - figures are made so coarse that no mark stands for fewer records than that, or for a single one.

    hidden_cells: the number of values taken out of tables, flows, estimates and statistics.
    """
    if audience == "internal":
        return DisclosedResults(study, hide_counts_below, "internal", 0)
    hiding = settle(study, hide_counts_below)
    models = tuple(disclosed_model(model, m, hiding) for m, model in enumerate(study.models))
    text = hiding.withheld.text
    figure = study.comparison_figure
    shown = replace(
        study,
        event_share=None if hiding.hides("events", 0) else study.event_share,
        records=_records(study, models, hiding),
        models=models,
        characteristics=_table(study.characteristics, ("characteristics",), hiding),
        findings=tuple(disclosed_finding(one, hiding.withheld) for one in study.findings),
        comparison=_table(study.comparison, ("comparison",), hiding),
        comparison_figure=disclosed_estimates_figure(figure, hiding) if isinstance(figure, EstimatesFigure) else None,
        notes=tuple(text(note) for note in study.notes),
        derived=tuple(
            replace(
                one,
                tables=tuple(disclosed_table(table, ("derived", d, t), hiding) for t, table in enumerate(one.tables)),
            )
            for d, one in enumerate(study.derived)
        ),
    )
    return DisclosedResults(shown, hide_counts_below, "shareable", hiding.taken)


def settle(study: StudyResults, threshold: int) -> Hiding:
    """What to hide in a study, before anything is taken out."""
    # No count lies between 0 and 1: nothing is small.
    if threshold < 2:
        return Hiding(threshold)
    counts = gather(study, threshold)
    hidden = Suppression(counts, threshold).run()
    places = {place for place, number in counts.places.items() if number in hidden}
    closed = closed_models(study, threshold)
    for owner, table in _tables(study):
        if (owner[0] in ("model", "check") and owner[1] in closed) or (owner[0] == "derived" and 0 in closed):
            places |= {("cell", owner, r, k) for r, k in count_cells(table)}
    hiding = Hiding(threshold, frozenset(places))
    large = frozenset(counts.values[number] for number in hidden if counts.values[number] >= threshold)
    hiding.withheld = Withheld(threshold, large, frozenset(_estimates(study, hiding)))
    return hiding


def _estimates(study: StudyResults, hiding: Hiding) -> Iterator[float]:
    """Estimates that must not stand anywhere: crude ones, and those of models whose answers are hidden counts."""
    for owner, table in _tables(study):
        yield from hidden_estimates(table, owner, hiding)
    for m, model in enumerate(study.models):
        crude = hidden_crude(model, m, hiding)
        closed = gives_all_away(model, m, hiding)
        for c, coefficient in enumerate(model.coefficients):
            if c in crude or closed:
                yield from crude_numbers(coefficient.crude)
            if c in crude or closed or hiding.hides("crude all", m, c):
                yield from crude_numbers(coefficient.crude_all_records)
            if closed:
                yield from estimate_numbers(coefficient)
        # with nothing adjusted for, an estimate says of its level what the crude one does
        alone = crude if not model.adjustment else frozenset()
        told = {one.label for c, one in enumerate(model.coefficients) if closed or c in alone}
        yield from finding_numbers(model, told)
        for c, one in enumerate(model.averages):
            if c in hidden_averages(model, m, hiding) or closed:
                yield from crude_numbers(one.crude)
        if closed:
            steps = [one.step for one in model.trends if one.step is not None]
            for one in (*model.averages, *steps):
                yield from estimate_numbers(one)
        records, events = analysed_and_events(model)
        if hiding.hides("events", m) and records and events:
            yield from (events / records, round(events / records, 6))


def _tables(study: StudyResults) -> Iterator[tuple[Place, Table]]:
    if study.characteristics is not None:
        yield ("characteristics",), study.characteristics
    if study.comparison is not None:
        yield ("comparison",), study.comparison
    for d, one in enumerate(study.derived):
        for t, table in enumerate(one.tables):
            yield ("derived", d, t), table
    for m, model in enumerate(study.models):
        for t, table in enumerate(model.tables):
            yield ("model", m, t), table
        for c, check in enumerate(model.checks):
            for t, table in enumerate(check.tables):
                yield ("check", m, c, t), table


def _table(table: Table | None, owner: Place, hiding: Hiding) -> Table | None:
    return None if table is None else disclosed_table(table, owner, hiding)


def _records(study: StudyResults, models: tuple[ModelResult, ...], hiding: Hiding) -> RecordsResult:
    """The study's accounting; where it repeats a model's, it reads as that one does."""
    own = study.records
    for before, after in zip(study.models, models, strict=True):
        if own.excluded == before.flow.left_out:
            excluded = after.flow.left_out
            break
    else:
        excluded = disclosed_exclusions(own.excluded, hiding)
    return replace(own, read=hiding.count(own.read, "read", own.read), excluded=excluded)
