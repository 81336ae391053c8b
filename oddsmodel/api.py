"""The Python front: fit a model to a data frame, look at it, send the report."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from os import PathLike
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from oddsmodel.design.formula import outcome_named
from oddsmodel.disclosure import disclose
from oddsmodel.errors import Fault, InputFault
from oddsmodel.findings import Finding
from oddsmodel.model.fitted import FittedModel
from oddsmodel.plan.faults import fault
from oddsmodel.plan.read import PlanFile, plan_from_values
from oddsmodel.records.load import records_from_frame
from oddsmodel.records.outcome import code_outcome
from oddsmodel.results.lead import EXACT, companion
from oddsmodel.results.study import CoefficientResult, DisclosedResults, ModelResult, StudyResults
from oddsmodel.study.answer import answer
from oddsmodel.study.check import CheckedPlan
from oddsmodel.study.data import RecordsInMemory
from oddsmodel.study.prepare import prepare
from oddsmodel.wording.plain import plain, quoted


@dataclass(frozen=True)
class Model:
    """An estimated model with everything the report says of it. Made by `fit`."""

    results: StudyResults
    fitted: FittedModel | None
    hide_counts_below: int

    @property
    def result(self) -> ModelResult:
        """All numbers of the model, before small counts are hidden."""
        return self.results.models[0]

    @property
    def beside(self) -> ModelResult | None:
        """The model by penalised likelihood that was added because maximum likelihood has no finite answer."""
        return companion(self.results, self.result)

    @property
    def findings(self) -> tuple[Finding, ...]:
        """What the analyst should know: of the records, then of the model."""
        return (*self.results.findings, *self.result.findings)

    def odds_ratios(self) -> pd.DataFrame:
        """A row a coefficient: odds ratio, Wald limits and p, profile limits; empty where there is no number.

        By the method "exact" there are exact and mid-P limits, the exact p-value and the median-unbiased odds ratio
        instead. An odds ratio without a finite estimate has the limit that its profile has on one side.
        """
        rows = [
            {"coefficient": one.label, "role": one.role, "odds_ratio": one.odds_ratio, **_limits(self.result, one)}
            for one in self.result.coefficients
        ]
        return pd.DataFrame(rows).set_index("coefficient") if rows else pd.DataFrame(rows)

    def compare(self) -> pd.DataFrame:
        """A row an exposure coefficient: crude beside adjusted, on the same records and on all that have the column."""
        rows = []
        for one in self.result.coefficients:
            if one.role != "exposure":
                continue
            crude, everyone = one.crude, one.crude_all_records
            limits = one.exact or one.profile
            rows.append(
                {
                    "coefficient": one.label,
                    "crude_odds_ratio": crude.odds_ratio if crude else None,
                    "crude_lower": crude.profile.lower if crude and crude.profile else None,
                    "crude_upper": crude.profile.upper if crude and crude.profile else None,
                    "adjusted_odds_ratio": one.odds_ratio,
                    "adjusted_lower": limits.lower,
                    "adjusted_upper": limits.upper,
                    "records": self.result.records,
                    "crude_on_all_records": everyone.odds_ratio if everyone else None,
                    "all_records": everyone.records if everyone else None,
                }
            )
        return pd.DataFrame(rows).set_index("coefficient") if rows else pd.DataFrame(rows)

    def checks(self) -> pd.DataFrame:
        """A row a check: what it is about, its verdict and its sentence."""
        rows = [
            {"check": one.title, "about": one.family, "verdict": one.verdict, "found": one.line}
            for one in self.result.checks
        ]
        return pd.DataFrame(rows).set_index("check") if rows else pd.DataFrame(rows)

    def report(self, path: str | PathLike[str] | None = None, *, audience: str = "shareable") -> str:
        """The HTML report; written to `path` where one is given (an internal one needs INTERNAL in its name)."""
        from oddsmodel.export.files import write_text
        from oddsmodel.report.document import render_report

        if audience not in ("shareable", "internal"):
            raise InputFault(fault("audience-unknown", "oddsmodel.report, audience", audience=quoted(str(audience))))
        if audience == "internal" and path is not None and "INTERNAL" not in Path(path).name:
            raise InputFault(fault("internal-not-named", plain(str(path))))
        text = render_report(self._disclosed(audience))
        if path is not None:
            write_text(Path(path), text)
        return text

    def _disclosed(self, audience: str = "shareable") -> DisclosedResults:
        return disclose(self.results, audience=audience, hide_counts_below=self.hide_counts_below)

    @cached_property
    def _summary(self) -> str:
        from oddsmodel.report.notebook import notebook_summary

        return notebook_summary(self._disclosed())

    def _repr_html_(self) -> str:
        return self._summary


def fit(
    formula: str,
    frame: pd.DataFrame,
    *,
    exposures: Sequence[str],
    event: Any = None,
    design: str = "cohort",
    title: str = "",
    question: str = "",
    columns: Mapping[str, Mapping[str, Any]] | None = None,
    keep: str | None = None,
    count: str | None = None,
    grouped_by: str | None = None,
    not_measured: Sequence[str] = (),
    level: float = 0.95,
    method: str | None = None,
    prior: Mapping[str, Any] | None = None,
    hide_counts_below: int = 5,
) -> Model:
    """Fit one logistic model to a data frame.

    formula: "outcome ~ exposure + adjustment", in the vetted formula language. event: the outcome's value that
    means the event happened. exposures: the columns the question is about. columns: per column what a plan would
    say in its section ({"age": {"per": 10, "units": "years"}}). method: "maximum likelihood", "penalised", "log-F" with
    a prior ({"m": 2, "columns": ["smoker"]}), or "exact". The rest is as in a plan.

    Raises InputFault with every fault found. A model without a finite, unique estimate has `result.status` other
    than "converged" and the reason among its findings. Where maximum likelihood has no finite answer and no method is
    given, `beside` is the same model by penalised likelihood.

    >>> import oddsmodel, pandas
    >>> frame = pandas.DataFrame({"died": [1, 0, 1, 0, 0, 1, 0, 1], "smoker": ["yes", "no"] * 4})
    >>> oddsmodel.fit("died ~ smoker", frame, event=1, exposures=["smoker"]).result.status
    'converged'
    """
    outcome = _outcome(formula, frame, exposures, not_measured, columns)
    way = {"method": method, "prior": dict(prior) if isinstance(prior, Mapping) else prior}
    file: PlanFile = plan_from_values(
        {
            "study": {
                "title": title or formula,
                "question": question,
                "design": design,
                "not_measured": list(not_measured),
            },
            "records": {
                key: value
                for key, value in (
                    ("source", "data frame"),
                    ("keep", keep),
                    ("count", count),
                    ("grouped_by", grouped_by),
                )
                if value is not None
            },
            "columns": {name: dict(section) for name, section in (columns or {}).items()},
            "outcome": {
                "column": outcome,
                **({} if event is None else {"event": event.item() if isinstance(event, np.generic) else event}),
            },
            "models": [
                {
                    "name": "main",
                    "formula": formula,
                    "exposures": list(exposures),
                    "level": level,
                    **{key: value for key, value in way.items() if value is not None},
                }
            ],
            "report": {"hide_counts_below": hide_counts_below},
        }
    )
    records = records_from_frame(frame, file.plan)
    coded = code_outcome(records, file.plan.outcome)
    data = RecordsInMemory(file.plan, records, coded)
    checked = CheckedPlan(file, data, prepare(file.plan, records, coded))
    results, fitted = answer(checked)
    return Model(results, fitted[0].model, hide_counts_below)


def _limits(model: ModelResult, one: CoefficientResult) -> dict[str, float | None]:
    """The limits and p-values of a coefficient by their columns: those that the model's method has."""
    if model.method != EXACT:
        return {
            "wald_lower": one.wald.lower,
            "wald_upper": one.wald.upper,
            "wald_p": one.wald.p,
            "profile_lower": one.profile.lower,
            "profile_upper": one.profile.upper,
        }
    exact = one.exact
    return {
        "exact_lower": exact.lower if exact else None,
        "exact_upper": exact.upper if exact else None,
        "exact_p": exact.p_doubled if exact else None,
        "mid_p_lower": exact.mid_p_lower if exact else None,
        "mid_p_upper": exact.mid_p_upper if exact else None,
        "mid_p_p": exact.p_mid if exact else None,
        "median_unbiased": exact.median_unbiased if exact else None,
    }


def _outcome(formula: object, frame: object, exposures: object, not_measured: object, columns: object) -> str:
    """The outcome's column, where everything is of the type it should be; InputFault with all that is not."""
    faults: list[Fault] = []
    names: list[str] = []
    if not isinstance(frame, pd.DataFrame):
        faults.append(fault("frame-not-a-frame", "oddsmodel.fit, frame"))
    elif isinstance(frame.columns, pd.MultiIndex):
        faults.append(fault("frame-names-nested", "oddsmodel.fit, frame"))
    else:
        names = [str(name) for name in frame.columns]
    for key, value, example in (("exposures", exposures, "smoker"), ("not_measured", not_measured, "frailty")):
        if isinstance(value, str | bytes) or not isinstance(value, Iterable):
            faults.append(fault("not-a-list-of-names", f"oddsmodel.fit, {key}", key=key, example=example))
    if columns is not None and not (
        isinstance(columns, Mapping) and all(isinstance(section, Mapping) for section in columns.values())
    ):
        faults.append(fault("columns-not-sections", "oddsmodel.fit, columns"))
    if not isinstance(formula, str):
        faults.append(fault("formula-not-text", "oddsmodel.fit, formula"))
    if faults or not isinstance(formula, str):
        raise InputFault(faults)
    outcome = outcome_named(formula, names, "oddsmodel.fit, formula")
    if outcome is None:
        raise InputFault(fault("formula-names-no-outcome", "oddsmodel.fit, formula"))
    return outcome
