"""What the sections show: tables in words, checks, methods, cause."""

from __future__ import annotations

from dataclasses import replace
from types import ModuleType

import pytest

from oddsmodel.progress import Silent
from oddsmodel.report.view.cause import cause, closing_cautions
from oddsmodel.report.view.checks import checks
from oddsmodel.report.view.methods import methods
from oddsmodel.report.view.sheet import Sheets
from oddsmodel.report.view.tables import TableView, table_view
from oddsmodel.results.lead import has_profile
from oddsmodel.results.study import DisclosedResults, ProfileResult, StudyResults, WaldResult
from oddsmodel.results.tables import Cell, CellKind, Hidden, Interval, Table, TableColumn
from oddsmodel.wording import say
from oddsmodel.wording.report_methods import REFERENCES, WAYS


def column(kind: CellKind, *cells: Cell) -> list[str]:
    table = Table("t", "T", (TableColumn("a", "A"), TableColumn("b", "B", kind)), tuple(("row", one) for one in cells))
    return [row.cells[1].text for row in table_view(table, 1, 5).rows]


def sheets() -> Sheets:
    return Sheets(5, Silent())


@pytest.mark.parametrize(
    ("kind", "cells", "texts"),
    [
        ("count", (4012, 0, Hidden()), ["4\u202f012", "0", "withheld"]),
        ("percent", (0.1234, None), ["12.3%", ""]),
        ("odds_ratio", (1.4123, 0.0312, "1 (reference)"), ["1.41", "0.031", "1 (reference)"]),
        ("interval", (Interval(1.1, 2.0), Interval(0.9, None)), ["1.10 to 2.00", "0.90 and above, no upper limit"]),
        ("interval", (Interval(-0.31, 0.25),), ["−0.310 to 0.250"]),
        ("p", (0.00002, 0.034, 0.5), ["under 0.001", "0.034", "0.50"]),
        ("number", (0.3996, -0.21, 0.0062), ["0.400", "−0.210", "0.006"]),
        ("number", (12.657, 25.0), ["12.7", "25.0"]),
        ("number", (3, 12000.0), ["3", "12\u202f000"]),
        ("number", (366.24, 0.0012, 9.1), ["366.2", "0.0", "9.1"]),
        ("number", (0.0, None), ["0", ""]),
    ],
)
def test_cells_are_written_alike_down_a_column(kind: CellKind, cells: tuple[Cell, ...], texts: list[str]) -> None:
    assert column(kind, *cells) == texts


def test_rows_of_a_block_share_a_receding_stem(sample: ModuleType) -> None:
    view: TableView = table_view(sample.CHARACTERISTICS, 1, 5)
    assert [row.cells[0].stem for row in view.rows] == ["", "", "", "Sex: ", "", f"{sample.WARD}: ", "", ""]
    assert view.rows[3].cells[0].text == "male"
    assert [row.starts_block for row in view.rows] == [False, True, True, False, True, False, True, True]


def test_the_gravest_check_of_a_family_speaks_for_it(sample: ModuleType) -> None:
    many = tuple(sample.check(f"fine {k}", "fine", "All is well.") for k in range(3))
    late = sample.check("late", "caution", "Something is wrong.")
    other = sample.check("influence", "fine", "Nobody stands out.")
    view = checks(replace(sample.model(), checks=(*many, late, other)), sheets())
    assert [one.title for one in view.lines] == ["Late", "Influence"]
    assert [one.title for one in view.further] == ["Fine 0", "Fine 1", "Fine 2"]


def test_the_certificate_is_one_sentence() -> None:
    assert say("certificate", digits=11.7, condition=2.3e7) == (
        "Each log odds ratio of this model is correct to at least 11 significant digits (condition number of the "
        "scaled information: 2.3 × 10⁷). This concerns the arithmetic only, not whether the model is right."
    )
    assert say("certificate", digits=None, condition=None).startswith("No number of correct digits can be claimed")


def test_methods_cite_only_what_was_done(sample: ModuleType) -> None:
    full = methods(sample.disclosed(), sample.model())
    text = " ".join(full.paragraphs)
    assert "profile likelihood (Venzon & Moolgavkar, 1988)" in text
    assert any(one.startswith("Hosmer DW") for one in full.references)
    assert not any(one.startswith("Brier") for one in full.references), "a check that did not apply is not cited"
    assert not any(one.startswith("Prentice") for one in full.references)

    main = sample.model(checks=(), tables=())
    wald = replace(main, coefficients=tuple(replace(c, profile=ProfileResult(None, None)) for c in main.coefficients))
    study: StudyResults = sample.study(design="case-control", models=(wald,))
    plain = methods(DisclosedResults(study, 5, "internal", 0), wald)
    text = " ".join(plain.paragraphs)
    assert "Venzon" not in text
    assert "withheld" not in text
    assert "Prentice & Pyke, 1979" in text
    assert not any(one.startswith(("Venzon", "Hosmer", "Woolf")) for one in plain.references)


def test_every_reference_cited_in_the_paragraph_is_listed(sample: ModuleType) -> None:
    view = methods(sample.disclosed(), sample.model())
    for author in ("Cox", "Venzon", "Wald", "Greenland", "Woolf", "Breslow", "Westreich", "Austin", "DeLong", "Fox"):
        assert any(one.startswith(author) for one in view.references), author
    assert {code for _, codes in WAYS.values() for code in codes} <= set(REFERENCES)


def test_cause_is_answered_from_the_plan(sample: ModuleType) -> None:
    view = cause(sample.study(), sample.model(), sheets())
    assert view.cautions[0].startswith(f"“{sample.WARD}” was measured after the exposure.")
    assert view.cautions[1].startswith("The plan names what nobody recorded: frailty and housing")
    assert view.questions[0].startswith("Was “Body mass index” measured before the exposure or after it?")
    assert view.questions[1].startswith("Why is “Sex” adjusted for?")
    assert view.table is not None
    assert [row.cells[1].text for row in view.table.rows][-2:] == ["after the exposure", "not stated"]


def test_cause_by_design(sample: ModuleType) -> None:
    trial = cause(sample.study(design="trial", not_measured=()), sample.model(adjustment=()), sheets())
    assert trial.answer[0].startswith("Allocation was by chance")
    assert trial.cautions == trial.questions == ()
    sampled = cause(sample.study(design="case-control"), sample.model(), sheets())
    assert any("controls stand for" in text for text in sampled.answer)
    at_once = cause(sample.study(design="cross-sectional", not_measured=()), sample.model(adjustment=()), sheets())
    assert any("which came first" in text for text in at_once.answer)
    assert at_once.cautions[0].startswith("Nothing was adjusted for")
    assert at_once.questions[0].startswith("The plan names no confounder")


def test_closing_cautions_are_always_there(sample: ModuleType) -> None:
    words = " ".join(closing_cautions(sample.study(not_measured=())))
    for told in ("not causation", "one person's care", "qualified analyst", "data-protection, ethics and reporting"):
        assert told in words


def test_withheld_limits_do_not_make_another_way_of_fitting(sample: ModuleType) -> None:
    nothing = {"odds_ratio": None, "wald": WaldResult(None, None, None), "profile": ProfileResult(None, None)}
    model = sample.model()
    withheld = replace(model, coefficients=tuple(replace(one, **nothing) for one in model.coefficients))
    assert has_profile(model)
    assert has_profile(withheld)
