"""A study invented by hand, with every kind of figure, hostile labels, hidden cells and a model without an answer."""

from __future__ import annotations

import math
from dataclasses import replace

from oddsmodel.findings import Finding
from oddsmodel.results.figures import (
    CalibrationFigure,
    CalibrationGroup,
    CurveFigure,
    CurvePoint,
    EstimateMark,
    EstimatesFigure,
    Figure,
    FlowFigure,
    HistogramFigure,
    ScatterFigure,
    SpreadFigure,
    StepFigure,
)
from oddsmodel.results.study import (
    AdjustmentColumn,
    CertificateResult,
    CheckResult,
    CoefficientResult,
    CrudeEstimate,
    DisclosedResults,
    Exclusion,
    Flow,
    ModelResult,
    ProfileResult,
    Provenance,
    RecordsResult,
    StudyResults,
    TermTest,
    WaldResult,
)
from oddsmodel.results.tables import Hidden, Interval, Table, TableColumn

SMOKER = "Smoking"
HOSTILE = '<script>alert("x")</script> & $x^2$ \\frac_{1}'
WARD = f"Ward {HOSTILE}"

FLOW = Flow(
    read=4012,
    left_out=(
        Exclusion("not-kept", "Not kept: age >= 18", 37),
        Exclusion("outcome-not-recorded", "“Readmitted within 30 days” not recorded", 58),
        Exclusion("exposure-not-recorded", "Smoking not recorded", 41),
        Exclusion("adjustment-not-recorded", f"An adjustment column not recorded: {WARD}", None),
    ),
    analysed=3871,
    events=612,
)


def coefficient(
    label: str,
    odds_ratio: float | None,
    lower: float | None,
    upper: float | None,
    *,
    term: str = "smoker",
    level: str | None = None,
    reference: str | None = None,
    role: str = "exposure",
    p: float | None = 0.0004,
    crude: float | None = None,
    shown: bool = True,
    reasons: dict[str, str] | None = None,
) -> CoefficientResult:
    wald = WaldResult(lower and lower * 0.99, (upper or odds_ratio or 1.0) * 0.995, p)
    return CoefficientResult(
        term=term,
        level=level,
        reference=reference,
        levels=None,
        role=role,  # type: ignore[arg-type]
        label=label,
        log_odds_ratio=math.log(odds_ratio) if odds_ratio else None,
        standard_error=0.08 if odds_ratio else None,
        odds_ratio=odds_ratio,
        wald=wald if odds_ratio else WaldResult(None, None, None),
        profile=ProfileResult(lower, upper),
        shown=shown,
        crude=CrudeEstimate(3871, crude, WaldResult(crude * 0.85, crude * 1.2, 0.001)) if crude else None,
        reasons=reasons or {},
    )


EXPOSURES = (
    coefficient(
        "Smoking: current against never", 1.41, 1.14, 1.74, level="current", reference="never", p=0.0017, crude=1.72
    ),
    coefficient(
        "Smoking: former against never", 1.08, 0.88, 1.32, level="former", reference="never", p=0.46, crude=1.21
    ),
    coefficient(
        "Smoking: not known against never",
        4.9,
        0.9,
        None,
        level="not known",
        reference="never",
        p=0.071,
        crude=5.3,
        reasons={"profile.upper": "There is no finite upper limit: the records allow any odds ratio, however large."},
    ),
)
ADJUSTMENT = (
    coefficient("Age, per 10 years", 1.23, 1.15, 1.32, term="age", role="adjustment", p=1e-9),
    coefficient("Sex: male against female", 0.94, 0.79, 1.12, term="sex", role="adjustment", p=0.49),
    coefficient(f"{WARD}: B against A", 0.078, 0.02, 0.31, term="ward", role="adjustment", p=0.002),
    coefficient("rcs(bmi, 4), column 1", 1.7, 1.2, 2.4, term="rcs(bmi, 4)", role="adjustment", shown=False),
)


def estimates_figure(id_: str, models: tuple[str, ...] = ()) -> EstimatesFigure:
    marks = []
    for one in EXPOSURES:
        for place, name in enumerate(models or ("crude", "adjusted")):
            factor = 1.0 + 0.06 * place if models else 1.0
            crude = name == "crude" and one.crude
            estimate = one.crude.odds_ratio if crude and one.crude else (one.odds_ratio or 1.0) * factor
            lower = estimate * 0.81 if crude and estimate else (one.profile.lower or 0.0) * factor
            upper = estimate * 1.24 if crude and estimate else one.profile.upper
            marks.append(EstimateMark(one.label, name, estimate, lower, upper))
    marks.append(EstimateMark(f"Pipe {HOSTILE}", "adjusted", None, None, None, note="Nobody in this group."))
    return EstimatesFigure(
        id_,
        f"Odds ratios of the exposure {HOSTILE}",
        "Odds ratios with 95% intervals. Current against never: crude 1.72, adjusted 1.41 (1.14 to 1.74).",
        tuple(marks[:-1] if models else marks),
    )


def flow_figure(flow: Flow, id_: str) -> FlowFigure:
    return FlowFigure(
        id_,
        "From the records read to the records analysed",
        "4 012 records were read, 141 left out for four reasons, 3 871 analysed, 612 of them with the event.",
        flow.read,
        tuple((one.reason, one.records) for one in flow.left_out),
        flow.analysed,
        flow.events,
    )


def calibration_figure() -> CalibrationFigure:
    groups = []
    for step in range(10):
        predicted = 0.05 + 0.035 * step
        observed = predicted + 0.012 * math.sin(step)
        groups.append(CalibrationGroup(predicted, observed, observed - 0.035, observed + 0.04, 387, 60))
    smooth = tuple((0.04 + 0.0037 * k, 0.04 + 0.0037 * k + 0.008 * math.sin(k / 14)) for k in range(90))
    return CalibrationFigure(
        "calibration",
        "Observed and predicted",
        "Observed shares lie within 2 points of the predicted.",
        tuple(groups),
        smooth,
    )


def roc_figure() -> StepFigure:
    points = tuple((k / 800, (k / 800) ** 0.45) for k in range(801))
    return StepFigure(
        "roc", "How well the model tells events apart", "The area under the curve is 0.690.", points, 0.69
    )


def curve_figure() -> CurveFigure:
    x = tuple(18 + 0.8 * k for k in range(90))
    curve = tuple(math.exp(0.00045 * (v - 50) ** 2 + 0.01 * (v - 50)) for v in x)
    return CurveFigure(
        "linearity-age",
        "The shape along age",
        "The curve leaves the straight line above 75 years.",
        f"Age, years {HOSTILE}",
        x,
        curve,
        tuple(v * 0.86 for v in curve),
        tuple(v * 1.18 for v in curve),
        tuple(math.exp(0.018 * (v - 50)) for v in x),
        50.0,
        tuple(
            (18 + 4 * k, 22 + 4 * k, None if k == 17 else int(300 * math.exp(-(((k - 9) / 5) ** 2)))) for k in range(18)
        ),
    )


def points_figure() -> CurveFigure:
    """Groups in place of the curve; the last one's interval goes far beyond the rest."""
    points = tuple(
        CurvePoint(x, math.exp(0.02 * (x - 50)), 300, 0.5, 2.0 if x < 80 else 900.0) for x in (25, 40, 60, 85)
    )
    reference = CurvePoint(50.0, 1.0, 300)
    return replace(curve_figure(), id="groups-age", curve=(), lower=(), upper=(), points=(*points, reference))


def spread_figure() -> SpreadFigure:
    return SpreadFigure(
        "stability",
        f"Odds ratios under all choices {HOSTILE}",
        "From 1.12 to 1.75.",
        tuple(1.12 + 0.01 * k for k in range(64)),
        1.31,
        1.75,
    )


def histogram_figure() -> HistogramFigure:
    edges = tuple(0.05 * k for k in range(21))
    return HistogramFigure(
        "overlap",
        "Overlap of the exposure groups",
        "The groups overlap between 0.2 and 0.8.",
        "Predicted share exposed",
        edges,
        (
            ("current", tuple(None if k < 1 else int(120 * math.exp(-(((k - 12) / 4) ** 2))) for k in range(20))),
            (f"never {HOSTILE}", tuple(int(400 * math.exp(-(((k - 7) / 4) ** 2))) for k in range(20))),
        ),
    )


def scatter_figure(points: int = 3000) -> ScatterFigure:
    x = tuple((k * 0.61803) % 1.0 * 0.5 for k in range(points))
    y = tuple(3.0 * math.sin(k * 1.7) ** 3 + 4 * x[k] for k in range(points))
    size = tuple(abs(math.sin(k * 0.37)) ** 8 for k in range(points))
    return ScatterFigure(
        "influence",
        "Covariate patterns that move the fit",
        "No pattern stands apart.",
        "Fitted probability",
        "Change in Pearson chi-square",
        x,
        y,
        size,
        (5,) * points,
        lines=(4.0,),
    )


LEVELS = Table(
    "levels",
    "By exposure",
    (
        TableColumn("label", "Exposure"),
        TableColumn("records", "Records", "count"),
        TableColumn("events", "Events", "count"),
        TableColumn("per_100", "Events per 100", "number"),
        TableColumn("crude", "Crude odds ratio", "odds_ratio"),
        TableColumn("crude_interval", "Its 95% interval", "interval"),
        TableColumn("adjusted", "Adjusted odds ratio", "odds_ratio"),
        TableColumn("adjusted_interval", "The adjusted one's 95% interval", "interval"),
    ),
    (
        ("Smoking: never", 1904, 241, 12.657, "1 (reference)", None, "1 (reference)", None),
        ("Smoking: former", 1203, 180, 14.96, 1.21, Interval(0.98, 1.49), 1.08, Interval(0.88, 1.32)),
        ("Smoking: current", 756, 189, 25.0, 1.72, Interval(1.4, 2.11), 1.41, Interval(1.14, 1.74)),
        ("Smoking: not known", 8, Hidden(), Hidden(), Hidden(), Hidden(), 4.9, Interval(0.9, None)),
    ),
    note="Crude: the exposure alone, on the same records as the adjusted estimate.",
    blocks=(0, 0, 0, 0),
)
CHANGE = Table(
    "crude_to_adjusted",
    "From crude to adjusted",
    (
        TableColumn("label", "Exposure"),
        TableColumn("crude", "Crude odds ratio", "odds_ratio"),
        TableColumn("adjusted", "Adjusted odds ratio", "odds_ratio"),
        TableColumn("log_difference", "Difference of logs", "number"),
        TableColumn("change", "Change of the odds ratio, %", "number"),
    ),
    (("Smoking: former", 1.21, 1.08, -0.1136, None), ("Smoking: current", 1.72, 1.41, -0.1987, -18.02)),
)
TWO_BY_TWO = Table(
    "two_by_two",
    "Ever smoked: the two groups",
    (
        TableColumn("label", "Ever smoked"),
        TableColumn("records", "Records", "count"),
        TableColumn("events", "Events", "count"),
        TableColumn("odds_ratio", "Odds ratio", "odds_ratio"),
        TableColumn("interval", "95% interval", "interval"),
        TableColumn("p", "p-value", "p"),
    ),
    (
        ("Ever smoked: yes", 1967, 371, None, None, None),
        ("Ever smoked: no", 1904, 241, None, None, None),
        ("Sample odds ratio, Woolf interval", None, None, 1.605, Interval(1.34, 1.91), None),
        ("Conditional estimate, exact limits", None, None, 1.604, Interval(1.34, 1.93), 0.0000002),
    ),
)
CHARACTERISTICS = Table(
    "characteristics",
    "Who they were, by smoking",
    (
        TableColumn("label", "Characteristic"),
        TableColumn("never", "never", "count"),
        TableColumn("never_share", "never, summary", "text"),
        TableColumn("current", "current", "count"),
        TableColumn("current_share", "current, summary", "text"),
        TableColumn("difference", "Standardised difference", "number"),
    ),
    (
        ("Records analysed", 1904, None, 756, None, None),
        ("Age, years: mean (standard deviation)", 1904, "58.1 (16.2)", 756, "51.9 (14.8)", 0.3996),
        ("Sex: female", 1010, "53.0%", 352, "46.6%", 0.13),
        ("Sex: male", 894, "47.0%", 404, "53.4%", None),
        (f"{WARD}: A", 1899, "99.7%", 751, "99.3%", 0.0062),
        (f"{WARD}: B", Hidden(), Hidden(), 5, "0.7%", None),
        ("Body mass index, kg/m²: median (quartiles)", 1880, "26.1 (23.0 to 30.2)", 741, "25.2 (22.1 to 29.0)", -0.21),
        ("Body mass index: not recorded", 24, None, 15, None, None),
    ),
    note="Of the records analysed.",
    blocks=(0, 1, 2, 2, 3, 3, 4, 5),
)


FAMILIES = {
    "events_per_parameter": "counting",
    "sparse_cells": "sparsity",
    "overlap": "sparsity",
    "linearity": "functional form",
    "influence": "influence",
    "collinearity": "collinearity",
}


def check(name: str, verdict: str, line: str, *figures: Figure, title: str = "", **more: object) -> CheckResult:
    return CheckResult(
        name=name,
        family=FAMILIES.get(name, "fit"),  # type: ignore[arg-type]
        title=title or name.replace("_", " ").capitalize(),
        verdict=verdict,  # type: ignore[arg-type]
        line=line,
        figures=figures,
        **more,  # type: ignore[arg-type]
    )


CHECKS = (
    check(
        "events_per_parameter",
        "fine",
        "There are 68 events for each of the 9 coefficients.",
        explanation="Few events bias.",
    ),
    check("sparse_cells", "look", f"The smallest cell holds few records: {WARD}.", title="Sparse cells"),
    check(
        "hosmer_lemeshow",
        "fine",
        "Observed and expected counts agree in 10 groups (p = 0.41).",
        title="Hosmer–Lemeshow",
        tables=(
            Table(
                "groups",
                "Groups of predicted risk",
                (
                    TableColumn("group", "Group"),
                    TableColumn("o", "Observed", "count"),
                    TableColumn("e", "Expected", "number"),
                ),
                (("1", 20, 18.25), ("2", 31, 33.4)),
            ),
        ),
        explanation="Groups records by predicted risk.\nSource: Hosmer & Lemeshow (1980).",
    ),
    check("calibration", "fine", "Observed shares follow the predicted ones.", calibration_figure()),
    check("auc", "fine", "The area under the curve is 0.69 (0.67 to 0.71).", roc_figure(), title="Telling apart"),
    check(
        "linearity",
        "caution",
        "Age does not act along a straight line; a curve moves the odds ratio from 1.41 to 1.38.",
        curve_figure(),
        title="Straight lines",
        findings=(Finding("caution", "not-linear", "Age is not linear in the logit (p = 0.003)."),),
    ),
    check("influence", "fine", "No covariate pattern moves the odds ratio by more than 2%.", scatter_figure()),
    check("overlap", "look", "In parts of the records hardly anyone was exposed.", histogram_figure()),
    check("collinearity", "fine", "No column is nearly a combination of others."),
    check("brier", "not applicable", "", title="Brier score", reasons={"brier": "Only asked for in prediction."}),
)


def model(**changes: object) -> ModelResult:
    main = ModelResult(
        id="main",
        name="main",
        formula="readmitted ~ smoker + age + sex + ward + rcs(bmi, 4)",
        method="maximum likelihood",
        added_by_program=False,
        variant={"missing": "complete records"},
        role="",
        why="",
        level=0.95,
        status="converged",
        exposures=("smoker",),
        exposure_labels=(SMOKER,),
        adjustment=("age", "sex", "ward", "bmi"),
        adjustment_labels=("Age", "Sex", WARD, "Body mass index"),
        flow=FLOW,
        records=3871,
        events=612,
        patterns=2904,
        parameters=9,
        log_likelihood=-1600.2,
        null_log_likelihood=-1690.0,
        coefficients=(
            coefficient("Intercept", 0.07, 0.04, 0.11, term="Intercept", role="intercept"),
            *EXPOSURES,
            *ADJUSTMENT,
        ),
        terms=(
            TermTest("smoker", 3, 12.8, 0.0051),
            TermTest("age", 1, 38.2, 1e-9),
            TermTest("all exposure columns", 3, 12.8, 0.0051),
            TermTest("whole model", 8, None, None, "Not computed."),
        ),
        checks=CHECKS,
        certificate=CertificateResult(11.4, 2.3e7),
        findings=(
            Finding("note", "noncollapsibility", "Odds ratios change on adjustment even where nothing confounds."),
        ),
        tables=(LEVELS, CHANGE, TWO_BY_TWO),
        figures=(flow_figure(FLOW, "main-flow"), estimates_figure("main-estimates")),
    )
    return replace(main, **changes)  # type: ignore[arg-type]


def study(**changes: object) -> StudyResults:
    short = model(
        id="minimally",
        name="minimally adjusted",
        formula="readmitted ~ smoker + age + sex",
        adjustment=("age", "sex"),
        adjustment_labels=("Age", "Sex"),
        checks=CHECKS[:3],
        tables=(),
        figures=(estimates_figure("minimally-estimates"),),
    )
    failed = model(
        id="separated",
        name=f"with hospital {HOSTILE}",
        status="no finite maximum",
        why="Hospitals differ.",
        coefficients=(),
        terms=(),
        checks=(),
        tables=(),
        figures=(),
        log_likelihood=None,
        certificate=CertificateResult(None, None),
        findings=(Finding("stop", "separated", "No finite estimate exists: everyone in hospital “K” had the event."),),
    )
    full = StudyResults(
        title="Smoking and readmission in a hospital network",
        question="Are people who smoke readmitted within 30 days more often than people who never smoked?",
        design="cohort",
        aim="association",
        audience="shareable",
        outcome="readmitted",
        outcome_label="Readmitted within 30 days",
        event="yes",
        event_share=612 / 3871,
        not_measured=("frailty", f"housing {HOSTILE}"),
        columns=(
            AdjustmentColumn("smoker", SMOKER, "unknown", ""),
            AdjustmentColumn("age", "Age", "before exposure", "older people smoke less and are readmitted more"),
            AdjustmentColumn("sex", "Sex", "before exposure", ""),
            AdjustmentColumn("ward", WARD, "after exposure", "wards differ"),
            AdjustmentColumn("bmi", "Body mass index", "unknown", "weight goes with smoking"),
        ),
        records=RecordsResult("records.csv", "3b" * 32, 4012, FLOW.left_out),
        models=(model(), short, failed),
        characteristics=CHARACTERISTICS,
        findings=(
            Finding("note", "few-distinct-values", f"“{WARD}” has two distinct values."),
            Finding(
                "caution",
                "odds-ratio-overstates-risk-ratio",
                "The event happened to 15.8% of the records. Above 10% an odds ratio lies further from 1 than the risk "
                "ratio: read as a risk ratio it would overstate it.",
            ),
        ),
        provenance=Provenance(
            plan_name="plan.toml",
            plan_text=f'[study]\ntitle = "Smoking and readmission"\n# {HOSTILE}\n\n[records]\nsource = "records.csv"\n',
            plan_sha256="9c" * 32,
            versions={"oddsmodel": "0.1.0", "Python": "3.11.2", "numpy": "2.4.0"},
            seed=20260101,
        ),
        comparison=Table(
            "models",
            "The models side by side",
            (
                TableColumn("exposure", "Exposure"),
                TableColumn("model", "Model"),
                TableColumn("records", "Records", "count"),
                TableColumn("odds_ratio", "Odds ratio", "odds_ratio"),
                TableColumn("interval", "Interval", "interval"),
            ),
            (
                ("Smoking: current against never", "main", 3871, 1.41, Interval(1.14, 1.74)),
                ("Smoking: current against never", "minimally adjusted", 3871, 1.49, Interval(1.21, 1.84)),
            ),
            blocks=(0, 0),
        ),
        comparison_figure=estimates_figure("models", ("main", "minimally adjusted")),
    )
    return replace(full, **changes)  # type: ignore[arg-type]


def disclosed(audience: str = "shareable", **changes: object) -> DisclosedResults:
    return DisclosedResults(study(**changes), 5, audience, 3)  # type: ignore[arg-type]
