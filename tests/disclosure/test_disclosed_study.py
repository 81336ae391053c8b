"""A whole invented study before and after: what is taken out, what stays, and that no hidden number is left."""

from __future__ import annotations

import json
import re
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from oddsmodel.disclosure import disclose
from oddsmodel.export.csv_tables import csv_files
from oddsmodel.export.results_json import results_text
from oddsmodel.results.figures import EstimatesFigure, FlowFigure
from oddsmodel.results.study import DisclosedResults, StudyResults
from oddsmodel.results.tables import Hidden

sys.path.insert(0, str(Path(__file__).parent))
from joint_records import BANDS, COMPLETE, EVENT, smoking
from sample_study import Sample, sample_study


def few_current_smokers() -> Sample:
    """Three of the current smokers had the event, in both models, which use the same records; nothing else is small."""
    joint = np.zeros((4, 3, 4, 2), dtype=int)
    joint[:2, :2, :3] = [[[40, 12], [60, 22], [50, 20]], [[45, 11], [66, 26], [58, 31]]]
    joint[1, :2, :3, 1] += 7
    joint[2, :2, :3, 0] = [[20, 30, 40], [21, 31, 41]]
    joint[2, 0, :, 1] = [1, 1, 1, 0]
    joint[0, 0, 3] = [30, 9]
    complete = joint[:3, :2, :3].sum(axis=(0, 1, 2))
    bands = np.stack([np.full(BANDS, number // BANDS) for number in complete], axis=1)
    bands[0] += complete - bands.sum(axis=0)
    return sample_study(np.concatenate([joint.ravel(), bands.ravel()]), other_records=False)


@pytest.fixture(scope="module")
def sample() -> Sample:
    return few_current_smokers()


@pytest.fixture(scope="module")
def disclosed(sample: Sample) -> DisclosedResults:
    return disclose(sample.study, audience="shareable", hide_counts_below=5)


def test_internal_results_are_as_they_were(sample: Sample) -> None:
    answer = disclose(sample.study, audience="internal", hide_counts_below=5)
    assert answer.study == sample.study
    assert answer.hidden_cells == 0
    assert answer.audience == "internal"


def test_the_small_count_is_hidden_wherever_it_stands(sample: Sample, disclosed: DisclosedResults) -> None:
    mask = COMPLETE & smoking(2) & EVENT
    assert sample.true(mask) == 3
    same = [(name, shown) for name, shown, other in sample.counts if (other == mask).all()]
    assert len(same) == 3  # by level in both models, and among the sparse cells
    for name, shown in same:
        assert isinstance(shown(sample.study), int), name
        assert isinstance(shown(disclosed.study), Hidden), name


def test_its_companion_is_hidden_in_every_table_too(sample: Sample, disclosed: DisclosedResults) -> None:
    hidden = [mask for _, shown, mask in sample.counts if isinstance(shown(disclosed.study), Hidden)]
    for name, shown, mask in sample.counts:
        if any((mask == one).all() for one in hidden):
            assert not isinstance(shown(disclosed.study), int), name


def test_a_crude_odds_ratio_that_would_give_it_away_is_nowhere(sample: Sample, disclosed: DisclosedResults) -> None:
    crude = [one.crude for one in sample.study.models[0].coefficients if one.role == "exposure"]
    numbers = [f"{one.odds_ratio:.6g}" for one in crude if one is not None and one.odds_ratio is not None]
    assert len(numbers) == 2
    text = results_text(disclosed) + "".join(csv_files(disclosed).values()) + repr(disclosed.study)
    for number in numbers:
        assert number not in text
    for one in disclosed.study.models[0].coefficients[1:3]:
        assert one.crude is not None
        assert one.crude.odds_ratio is None
        assert "give away" in one.reasons["crude"]
        # The adjusted odds ratio stays.
        assert one.odds_ratio is not None


def test_a_model_of_the_exposure_alone_is_its_counts_in_another_form(disclosed: DisclosedResults) -> None:
    alone = disclosed.study.models[1]
    assert [one.odds_ratio for one in alone.coefficients] == [None] * 3
    assert alone.log_likelihood is None
    assert alone.null_log_likelihood is None
    assert {"log_likelihood", "null_log_likelihood"} <= alone.reasons.keys()
    assert all(term.likelihood_ratio is None and term.reason for term in alone.terms)
    assert disclosed.study.comparison is not None
    assert all(isinstance(row[4], Hidden) for row in disclosed.study.comparison.rows[1::2])


def test_figures_lose_the_same_estimates(disclosed: DisclosedResults) -> None:
    figures = [*disclosed.study.models[0].figures, disclosed.study.comparison_figure]
    for figure in figures:
        if isinstance(figure, EstimatesFigure):
            crude = [mark for mark in figure.marks if mark.series == "crude"]
            assert crude
            assert all(mark.estimate is None and mark.note for mark in crude)
            assert all(mark.estimate is not None for mark in figure.marks if mark.series == "adjusted")
            assert "crude" not in figure.alt


def test_totals_stay_where_they_are_safe(sample: Sample, disclosed: DisclosedResults) -> None:
    before, after = sample.study.models[0], disclosed.study.models[0]
    assert (after.records, after.events, after.flow) == (before.records, before.events, before.flow)
    assert after.null_log_likelihood == before.null_log_likelihood
    assert disclosed.study.records == sample.study.records


def test_share_of_a_hidden_count_is_hidden_with_it(disclosed: DisclosedResults) -> None:
    levels = disclosed.study.models[0].tables[0]
    for row in levels.rows:
        assert isinstance(row[2], Hidden) == isinstance(row[3], Hidden)
    groups = disclosed.study.models[0].checks[1].tables[0]
    for row in groups.rows:
        assert isinstance(row[3], Hidden) == (isinstance(row[1], Hidden) or isinstance(row[2], Hidden))


def test_a_pattern_of_one_record_does_not_say_who(disclosed: DisclosedResults) -> None:
    (patterns,) = disclosed.study.models[0].checks[2].tables
    assert [isinstance(cell, Hidden) for cell in patterns.rows[0]] == [True, True, False]
    assert patterns.rows[1] == ("Age: 50, Sex: female", 12, 0.1)


def test_statistics_and_sentences_say_no_small_count(disclosed: DisclosedResults) -> None:
    sparse = disclosed.study.models[0].checks[0]
    assert sparse.statistics["smallest_cell"] is None
    assert "under 5" in sparse.reasons["smallest_cell"]
    assert sparse.statistics["levels"] == 8
    assert sparse.line == "The smallest cell has fewer than 5 events."
    (finding,) = disclosed.study.findings
    assert finding.message.startswith("fewer than 5 records have an unlikely age")
    assert "0.4" not in finding.message
    assert finding.facts == {"records": "fewer than 5", "share": "a share not shown"}


def test_number_of_hidden_cells(sample: Sample, disclosed: DisclosedResults) -> None:
    cells = sum(
        isinstance(cell, Hidden)
        for model in disclosed.study.models
        for table in (*model.tables, *(table for check in model.checks for table in check.tables))
        for row in table.rows
        for cell in row
    )
    assert disclosed.hidden_cells > cells > 0
    again = disclose(sample.study, audience="shareable", hide_counts_below=5)
    assert again == disclosed


@pytest.mark.parametrize("threshold", [0, 1])
def test_without_a_threshold_no_count_is_hidden_but_figures_are_coarse(sample: Sample, threshold: int) -> None:
    answer = disclose(sample.study, audience="shareable", hide_counts_below=threshold).study
    assert answer.models[0].tables == sample.study.models[0].tables
    assert answer.characteristics == sample.study.characteristics
    assert answer.models[0].checks[2].figures != sample.study.models[0].checks[2].figures


# Flows


def flow_study(left_out: dict[str, int], analysed: int) -> StudyResults:
    study = few_current_smokers().study
    model = study.models[0]
    exclusions = tuple(replace(model.flow.left_out[0], code=r, reason=r, records=n) for r, n in left_out.items())
    read = sum(left_out.values()) + analysed
    flow = replace(model.flow, read=read, left_out=exclusions, analysed=analysed, events=200)
    figure = FlowFigure("flow", "", "everything", read, tuple(left_out.items()), analysed, 200)
    model = replace(
        model, flow=flow, records=analysed, events=200, tables=(), checks=(), coefficients=(), figures=(figure,)
    )
    records = replace(study.records, read=read, excluded=exclusions)
    return replace(
        study, models=(model,), records=records, characteristics=None, comparison=None, comparison_figure=None
    )


def shown_flow(left_out: dict[str, int], analysed: int = 900) -> tuple[int | None, list[tuple[str, int | None]]]:
    study = disclose(flow_study(left_out, analysed), audience="shareable", hide_counts_below=5).study
    flow = study.models[0].flow
    (figure,) = study.models[0].figures
    assert isinstance(figure, FlowFigure)
    assert figure.left_out == tuple((one.reason, one.records) for one in flow.left_out)
    assert (figure.read, figure.analysed) == (flow.read, flow.analysed)
    assert "everything" not in figure.alt
    assert not re.search(r"\b[1-4] left out", figure.alt)
    assert study.records.read == flow.read
    assert study.records.excluded == flow.left_out
    return flow.read, [(one.reason, one.records) for one in flow.left_out]


def test_small_reasons_are_told_together() -> None:
    read, left_out = shown_flow({"outcome": 40, "smoking": 3, "sex": 4, "age": 0})
    assert read == 947
    assert left_out == [("outcome", 40), ("age", 0), ("other reasons, together", 7)]


def test_one_small_reason_takes_the_next_with_it() -> None:
    read, left_out = shown_flow({"outcome": 40, "smoking": 3, "sex": 14})
    assert read == 957
    assert left_out == [("outcome", 40), ("other reasons, together", 17)]


def test_one_small_reason_alone_takes_the_records_read_with_it() -> None:
    """Read less analysed would give it away; the number analysed is what everything else rests on and stays."""
    read, left_out = shown_flow({"outcome": 3})
    assert read is None
    assert left_out == [("outcome", None)]
    document = json.loads(results_text(disclose(flow_study({"outcome": 3}, 900), audience="", hide_counts_below=5)))
    assert document["records"]["read"] is None
    assert "under 5" in document["reasons"]["records.read"]


def test_a_few_events_in_all_hide_what_tells_them() -> None:
    study = flow_study({"outcome": 40}, 900)
    model = replace(study.models[0], events=3, flow=replace(study.models[0].flow, events=3))
    study = replace(study, models=(model,), event_share=3 / 900)
    answer = disclose(study, audience="shareable", hide_counts_below=5).study
    assert answer.event_share is None
    assert answer.models[0].events is None
    assert answer.models[0].flow.events is None
    assert answer.models[0].null_log_likelihood is None
    assert answer.models[0].records == 900
