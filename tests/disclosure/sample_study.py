"""An invented study of smoking and readmission, made by hand from a small joint table, with a key to every count.

The joint table holds numbers of records by smoking, sex, age band (each also "not recorded") and outcome, and apart
from that the complete records by band of fitted risk and outcome. Every count in the study is the sum over some of
these cells; `Sample.counts` says which, so that an attacker in the tests can write each shown number as an equation
about them without knowing how the package thinks of it.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from joint_records import (
    AGE,
    BANDS,
    COMPLETE,
    EVENT,
    EVERYONE,
    HAS_SMOKING,
    SEX,
    SMOKING,
    Mask,
    age,
    bands,
    index,
    sex,
    smoking,
)
from numpy.typing import NDArray
from sample_estimates import coefficient, crude_odds_ratio, marks, marks_of

from oddsmodel.findings import Finding
from oddsmodel.results.figures import (
    CalibrationFigure,
    CalibrationGroup,
    CurveFigure,
    EstimatesFigure,
    FlowFigure,
    HistogramFigure,
    ScatterFigure,
    StepFigure,
)
from oddsmodel.results.study import (
    AdjustmentColumn,
    CertificateResult,
    CheckResult,
    CoefficientResult,
    CrudeEstimate,
    Exclusion,
    Flow,
    ModelResult,
    Provenance,
    RecordsResult,
    StudyResults,
    TermTest,
)
from oddsmodel.results.tables import Cell, Interval, Table, TableColumn

Shown = Callable[[StudyResults], object]


@dataclass
class Sample:
    """The joint table, the study made from it, and for each of its counts where it stands and what it sums."""

    joint: NDArray[np.int64]
    study: StudyResults
    counts: list[tuple[str, Shown, Mask]] = field(default_factory=list)

    def true(self, mask: Mask) -> int:
        return int(self.joint[mask].sum())


def sample_study(joint: NDArray[np.int64], *, other_records: bool = True) -> Sample:
    """The study: a main model adjusted for sex and age band, and one of smoking alone.

    other_records: the second model uses all records with smoking recorded, not those of the main model.
    """
    making = _Making(joint)
    second = HAS_SMOKING if other_records else COMPLETE
    models = (
        making.model(0, "main", COMPLETE, adjusted=True),
        making.model(1, "smoking alone", second, adjusted=False),
    )
    study = StudyResults(
        title="Smoking and readmission",
        question="Are smokers readmitted more often?",
        design="cohort",
        aim="association",
        audience="shareable",
        outcome="readmitted",
        outcome_label="Readmitted within 30 days",
        event="yes",
        event_share=making.true(COMPLETE & EVENT) / making.true(COMPLETE),
        not_measured=("frailty",),
        columns=(AdjustmentColumn("sex", "Sex", "before exposure", "differs by ward"),),
        records=RecordsResult("records.csv", "0" * 64, making.true(EVERYONE), models[0].flow.left_out),
        models=models,
        characteristics=making.characteristics(),
        findings=(
            Finding("note", "invented-code", "3 records have an unlikely age (0.4%).", {"records": 3, "share": 0.004}),
        ),
        provenance=Provenance("plan.toml", "[study]\n", "1" * 64, {"oddsmodel": "0.1.0"}, 20260101),
        comparison=making.comparison(models),
        comparison_figure=EstimatesFigure("models", "Odds ratios under each model", "", marks(models[0])),
    )
    making.count("records read", lambda s: s.records.read, EVERYONE)
    return Sample(joint, study, making.counts)


class _Making:
    def __init__(self, joint: NDArray[np.int64]) -> None:
        self.joint = joint
        self.counts: list[tuple[str, Shown, Mask]] = []

    def true(self, mask: Mask) -> int:
        return int(self.joint[mask].sum())

    def count(self, name: str, shown: Shown, mask: Mask) -> None:
        self.counts.append((name, shown, mask))

    def cell(self, name: str, table: Callable[[StudyResults], Table], row: int, column: int, mask: Mask) -> int:
        def shown(s: StudyResults) -> object:
            try:
                return table(s).rows[row][column]
            except IndexError:  # the whole check is withheld
                return None

        self.count(f"{name}, row {row}, column {column}", shown, mask)
        return self.true(mask)

    def model(self, m: int, name: str, analysed: Mask, *, adjusted: bool) -> ModelResult:
        records, events = self.true(analysed), self.true(analysed & EVENT)
        self.count(f"{name} records", lambda s: s.models[m].records, analysed)
        self.count(f"{name} events", lambda s: s.models[m].events, analysed & EVENT)
        coefficients = tuple(self.coefficients(analysed, adjusted))
        flow = self.flow(m, analysed)
        checks = (self.sparse(m, analysed), *self.groups(m, analysed)) if adjusted else ()
        return ModelResult(
            id=f"model-{m + 1}",
            name=name,
            formula="readmitted ~ smoking" + (" + sex + age" if adjusted else ""),
            method="maximum likelihood",
            added_by_program=False,
            variant={"outcome": "readmitted", "missing": "complete records", "covariance": "model"},
            role="main",
            why="",
            level=0.95,
            status="converged",
            exposures=("smoking",),
            exposure_labels=("Smoking",),
            adjustment=("sex", "age") if adjusted else (),
            adjustment_labels=("Sex", "Age") if adjusted else (),
            flow=flow,
            records=records,
            events=events,
            patterns=18 if adjusted else 3,
            parameters=6 if adjusted else 3,
            log_likelihood=-0.4 * records,
            null_log_likelihood=-0.41 * records,
            coefficients=coefficients,
            terms=(TermTest("smoking", 2, 7.25, 0.0266), TermTest("whole model", 5, 40.5, 1e-7)),
            checks=checks,
            certificate=CertificateResult(12.5, 31.0),
            findings=(),
            tables=(self.levels(m, name, analysed, coefficients), self.two_by_two(m, name, analysed)),
            figures=(
                FlowFigure(
                    f"flow-{m}",
                    "Who was counted",
                    "Everyone, with every number.",
                    flow.read,
                    tuple((one.reason, one.records) for one in flow.left_out),
                    flow.analysed,
                    flow.events,
                ),
                EstimatesFigure(f"estimates-{m}", "Odds ratios", "Every odds ratio.", marks_of(coefficients)),
            ),
        )

    def coefficients(self, analysed: Mask, adjusted: bool) -> list[CoefficientResult]:
        found = [coefficient("Intercept", None, None, "intercept", "Intercept", 0.09, None)]
        for place, level in enumerate(SMOKING[1:], start=1):
            crude = self.crude(analysed, place)
            everyone = self.crude(HAS_SMOKING, place)
            ratio = 1.1 + place / 10 if adjusted or crude is None else crude.odds_ratio
            label = f"Smoking: {level} against never"
            found.append(coefficient("smoking", level, "never", "exposure", label, ratio, crude, everyone))
        if adjusted:
            found.append(coefficient("sex", "male", "female", "adjustment", "Sex: male against female", 1.3, None))
        return found

    def crude(self, analysed: Mask, place: int) -> CrudeEstimate | None:
        numbers = [self.true(analysed & smoking(k) & outcome) for k in (place, 0) for outcome in (EVENT, ~EVENT)]
        found = crude_odds_ratio(*numbers)
        return found and CrudeEstimate(self.true(analysed), found.odds_ratio, found.wald, found.profile)

    def flow(self, m: int, analysed: Mask) -> Flow:
        reasons = {"smoking not recorded": EVERYONE & ~HAS_SMOKING}
        if (analysed == COMPLETE).all():
            reasons["sex not recorded"] = HAS_SMOKING & sex(2)
            reasons["age not recorded"] = HAS_SMOKING & ~sex(2) & age(3)
        everyone = EVERYONE
        self.count(f"flow {m} read", lambda s: s.models[m].flow.read, everyone)
        self.count(f"flow {m} analysed", lambda s: s.models[m].flow.analysed, analysed)

        def left_out(reason: str) -> Shown:
            return lambda s: next((one.records for one in s.models[m].flow.left_out if one.reason == reason), None)

        for reason, mask in reasons.items():
            self.count(f"flow {m} {reason}", left_out(reason), mask)
        return Flow(
            self.true(everyone),
            tuple(Exclusion(reason.replace(" ", "-"), reason, self.true(mask)) for reason, mask in reasons.items()),
            self.true(analysed),
            self.true(analysed & EVENT),
        )

    def levels(self, m: int, name: str, analysed: Mask, coefficients: tuple[CoefficientResult, ...]) -> Table:
        columns = (
            TableColumn("label", "Exposure"),
            TableColumn("records", "Records", "count", sums_known=True),
            TableColumn("events", "Events", "count", part_of="records", sums_known=True),
            TableColumn("per_100", "Events per 100", "number", hidden_with=("records", "events")),
            TableColumn("crude", "Crude odds ratio", "odds_ratio", hidden_with_block=True),
            TableColumn("crude_interval", "Its interval", "interval", hidden_with_block=True),
            TableColumn("adjusted", "Adjusted odds ratio", "odds_ratio", hidden_with_block=name != "main"),
        )
        rows: list[tuple[Cell, ...]] = []

        def table(s: StudyResults) -> Table:
            return s.models[m].tables[0]

        for place, level in enumerate(SMOKING):
            mask = analysed & smoking(place)
            records = self.cell(f"{name} levels", table, place, 1, mask)
            events = self.cell(f"{name} levels", table, place, 2, mask & EVENT)
            estimates: tuple[Cell, ...] = ("1 (reference)", None, "1 (reference)")
            if place:
                one = coefficients[place]
                limits = one.crude and one.crude.wald
                interval = Interval(limits.lower, limits.upper) if limits else None
                estimates = (one.crude.odds_ratio if one.crude else None, interval, one.odds_ratio)
            rows.append((f"Smoking: {level}", records, events, 100 * events / max(records, 1), *estimates))
        return Table("levels", "By exposure", columns, tuple(rows), "", (0, 0, 0))

    def two_by_two(self, m: int, name: str, analysed: Mask) -> Table:
        """Current and former together against never, with the records without the event in a column of their own."""
        columns = (
            TableColumn("label", "Smoking"),
            TableColumn("records", "Records", "count", sums_known=True),
            TableColumn("events", "Events", "count", part_of="records", sums_known=True),
            TableColumn("others", "No event", "count", part_of="records", sums_known=True),
            TableColumn("odds_ratio", "Odds ratio", "odds_ratio", hidden_with_block=True),
        )

        def table(s: StudyResults) -> Table:
            return s.models[m].tables[1]

        rows: list[tuple[Cell, ...]] = []
        for row, (level, mask) in enumerate((("ever", smoking(1) | smoking(2)), ("never", smoking(0)))):
            parts = [analysed & mask, analysed & mask & EVENT, analysed & mask & ~EVENT]
            counts = [self.cell(f"{name} 2x2", table, row, k + 1, part) for k, part in enumerate(parts)]
            rows.append((f"Smoking: {level}", *counts, None))
        a, b, c, d = (int(rows[r][k]) for r in (0, 1) for k in (2, 3))  # type: ignore[arg-type]
        crude = crude_odds_ratio(a, b, c, d)
        rows.append(("Sample odds ratio", None, None, None, crude.odds_ratio if crude else None))
        return Table("two_by_two", "The two groups", columns, tuple(rows), "", (0, 0, 0))

    def sparse(self, m: int, analysed: Mask) -> CheckResult:
        columns = (
            TableColumn("column", "Column"),
            TableColumn("level", "Level"),
            TableColumn("records", "Records", "count", sums_known=True),
            TableColumn("events", "Events", "count", part_of="records", sums_known=True),
        )

        def table(s: StudyResults) -> Table:
            return s.models[m].checks[0].tables[0]

        rows: list[tuple[Cell, ...]] = []
        blocks: list[int] = []
        for block, (label, axis, levels) in enumerate((("Smoking", 0, SMOKING), ("Sex", 1, SEX), ("Age", 2, AGE))):
            for place, level in enumerate(levels):
                mask = analysed & index(axis, place)
                row = len(rows)
                counts = [self.cell("sparse", table, row, k + 2, part) for k, part in enumerate((mask, mask & EVENT))]
                rows.append((label, level, *counts))
                blocks.append(block)
        smallest = min(int(row[3]) for row in rows)  # type: ignore[arg-type]
        return CheckResult(
            "sparse_cells",
            "sparsity",
            "Sparse cells",
            "look",
            f"The smallest cell has {smallest} events.",
            statistics={"levels": len(rows), "smallest_cell": smallest},
            tables=(Table("sparse_cells", "Counts by level", columns, tuple(rows), "", tuple(blocks)),),
        )

    def groups(self, m: int, analysed: Mask) -> tuple[CheckResult, ...]:
        """Two ways to cut the order of fitted risk: a table of nine groups and a calibration figure of six."""
        columns = (
            TableColumn("group", "Group"),
            TableColumn("records", "Records", "count", sums_known=True),
            TableColumn("events", "Events", "count", part_of="records", sums_known=True),
            TableColumn("expected", "Events expected", "number", hidden_with=("records", "events")),
        )

        def table(s: StudyResults) -> Table:
            return s.models[m].checks[1].tables[0]

        rows: list[tuple[Cell, ...]] = []
        for cut in _cuts(self, 9):
            parts = (bands(*cut), bands(*cut, slice(1, 2)))
            counts = [self.cell("groups", table, len(rows), k + 1, part) for k, part in enumerate(parts)]
            rows.append((str(len(rows) + 1), *counts, counts[1] + 0.4))
        cuts = _cuts(self, 6)
        marks = []
        for number, cut in enumerate(cuts):
            records, events = self.true(bands(*cut)), self.true(bands(*cut, slice(1, 2)))
            marks.append(CalibrationGroup((number + 1) / 20, events / records, 0.0, 1.0, records, events))
        self.calibration_groups(m, cuts)
        n = self.true(analysed)
        figures = (
            CalibrationFigure(
                "calibration", "Calibration", "Groups.", tuple(marks), ((0.001, 0.0), (0.1, 0.1), (0.9, 1.0))
            ),
            StepFigure(
                "roc", "Curve", "The curve.", _steps(self.true(analysed & EVENT), self.true(analysed & ~EVENT)), 0.7
            ),
            HistogramFigure(
                "overlap",
                "Overlap",
                "",
                "Risk",
                (0.0, 0.2, 0.4, 0.6, 0.8, 1.0),
                (("current", (40, 20, 9, 3, 0)), ("never", (200, 100, 7, 2, 1))),
            ),
            CurveFigure(
                "linearity-1",
                "Age",
                "",
                "Age (years)",
                tuple(map(float, range(18, 102))),
                *((tuple(1.0 + k / 100 for k in range(84)),) * 4),
                50.0,
                tuple(
                    (18.0 + 7 * k, 25.0 + 7 * k, c) for k, c in enumerate((3, 40, 60, 70, 2, 60, 50, 30, 9, 4, 2, 1))
                ),
            ),
            ScatterFigure(
                "influence",
                "Influence",
                "Every pattern a point.",
                "Risk",
                "Fall",
                tuple(k / 40 for k in range(40)),
                tuple(float((k * 7) % 13) for k in range(40)),
                (1.0,) * 40,
                (*(1,) * 30, *(6,) * 10),
            ),
        )
        influence = Table(
            "influential_patterns",
            "Patterns that move the odds ratio most",
            (
                TableColumn("pattern", "Pattern", hidden_with=("records",)),
                TableColumn("records", "Records", "count"),
                TableColumn("leverage", "Leverage", "number"),
            ),
            (("Age: 101, Sex: male", 1, 0.4), ("Age: 50, Sex: female", 12, 0.1)),
        )
        return (
            CheckResult(
                "hosmer_lemeshow",
                "fit",
                "Groups",
                "fine",
                "Fits.",
                statistics={"groups": len(rows), "statistic": 7.1, "df": 7, "p": 0.42},
                tables=(Table("groups_of_fitted_probability", "Observed and expected", columns, tuple(rows)),),
            ),
            CheckResult(
                "calibration", "fit", "Calibration", "fine", f"On {n} records.", figures=figures, tables=(influence,)
            ),
        )

    def calibration_groups(self, m: int, cuts: list[tuple[int, int]]) -> None:
        """Each group drawn is some of the original ones in a row: known by the records up to its end."""
        ends = np.cumsum([self.true(bands(*cut)) for cut in cuts]).tolist()

        def drawn(s: StudyResults, end: int, events: bool) -> object:
            figures = [f for check in s.models[m].checks for f in check.figures if isinstance(f, CalibrationFigure)]
            groups = figures[0].groups if figures else ()
            before = np.cumsum([group.records for group in groups]).tolist()
            if end not in before:
                return None
            return sum(g.events if events else g.records for g in groups[: before.index(end) + 1])

        for k, end in enumerate(ends):
            below = (0, cuts[k][1])
            self.count(f"calibration {k}", lambda s, end=end: drawn(s, end, False), bands(*below))
            self.count(f"calibration {k} events", lambda s, end=end: drawn(s, end, True), bands(*below, slice(1, 2)))

    def characteristics(self) -> Table:
        columns: list[TableColumn] = [TableColumn("label", "Characteristic")]
        for k, level in enumerate(SMOKING):
            columns.append(
                TableColumn(f"group_{k + 1}_records", f"Smoking: {level}, records", "count", sums_known=True)
            )
            columns.append(TableColumn(f"group_{k + 1}", f"{level}, summary", hidden_with=(f"group_{k + 1}_records",)))
        columns.append(TableColumn("difference", "Standardised difference", "number", hidden_with_block=True))
        rows: list[tuple[Cell, ...]] = []
        blocks: list[int] = []

        def table(s: StudyResults) -> Table:
            assert s.characteristics is not None
            return s.characteristics

        def line(label: str, mask: Mask, block: int, of: Mask) -> None:
            cells: list[Cell] = [label]
            for place in range(3):
                number = self.cell("characteristics", table, len(rows), 2 * place + 1, mask & smoking(place))
                whole = self.true(of & smoking(place))
                cells += [number, f"{100 * number / whole:.1f}%" if whole else None]
            rows.append((*cells, 0.12))
            blocks.append(block)

        line("Records analysed", COMPLETE, 0, COMPLETE)
        for block, (label, axis, levels) in enumerate((("Sex", 1, SEX), ("Age", 2, AGE))):
            for place, level in enumerate(levels):
                line(f"{label}: {level}", COMPLETE & index(axis, place), 2 * block + 1, COMPLETE)
            line(f"{label}: not recorded", index(axis, len(levels)), 2 * block + 2, EVERYONE)
        return Table("characteristics", "Who they were", tuple(columns), tuple(rows), "", tuple(blocks))

    def comparison(self, models: tuple[ModelResult, ...]) -> Table:
        columns = (
            TableColumn("exposure", "Exposure"),
            TableColumn("model", "Model"),
            TableColumn("records", "Records", "count"),
            TableColumn("events", "Events", "count", part_of="records"),
            TableColumn("odds_ratio", "Odds ratio", "odds_ratio", hidden_with=("records", "events")),
        )
        rows: list[tuple[Cell, ...]] = [
            (one.label, model.name, model.records, model.events, one.odds_ratio)
            for k in (1, 2)
            for model in models
            for one in (model.coefficients[k],)
        ]
        masks = [COMPLETE, HAS_SMOKING if models[1].records != models[0].records else COMPLETE]

        def table(s: StudyResults) -> Table:
            assert s.comparison is not None
            return s.comparison

        for row in range(len(rows)):
            for column, part in ((2, masks[row % 2]), (3, masks[row % 2] & EVENT)):
                self.cell("comparison", table, row, column, part)
        return Table("models", "The models side by side", columns, tuple(rows), "", (0, 0, 1, 1))


def _cuts(making: _Making, number: int) -> list[tuple[int, int]]:
    """Groups of bands in a row, none of them empty."""
    size = BANDS // number
    cuts = [(k, k + size) for k in range(0, BANDS, size)]
    return [cut for cut in cuts if making.true(bands(*cut))]


def _steps(events: int, others: int) -> tuple[tuple[float, float], ...]:
    return tuple((k / others, min(1.0, (k / others) ** 0.5)) for k in range(others + 1)) if others and events else ()
