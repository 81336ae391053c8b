"""Intercepts of a penalised model from which risks may be predicted."""

from __future__ import annotations

from oddsmodel.likelihood import JeffreysPenalisedLikelihood
from oddsmodel.measures.risks import QUANTITY
from oddsmodel.model.fitted import FittedModel
from oddsmodel.model.rows import MOST_PATTERNS
from oddsmodel.results.tables import Table, TableColumn
from oddsmodel.wording import say


def corrected_intercepts(model: FittedModel) -> tuple[Table, ...]:
    """FLIC and FLAC (Puhr et al. 2017) beside the penalised intercept; none where the design knows no risk, or where
    the model has no intercept or is not penalised."""
    from oddsmodel.inference.corrected_intercept import flac, flic

    constant = next((i for i, column in enumerate(model.design.columns) if column.kind == "intercept"), None)
    if constant is None or not isinstance(model.likelihood, JeffreysPenalisedLikelihood):
        return ()
    if model.study_design not in QUANTITY:
        return ()
    columns = (
        TableColumn("method", "Intercept"),
        TableColumn("intercept", "Log odds", "number"),
    )
    kept = flic(model.binomial, model.fit.coefficients, constant)
    # covariate patterns are in memory, wherever the records are
    augmented = flac(model.binomial, model.fit) if model.rows.number <= MOST_PATTERNS else None
    found = (
        ("Penalised likelihood", float(model.fit.coefficients[constant])),
        ("Corrected, other coefficients kept (FLIC)", kept),
        ("From augmented records (FLAC)", None if augmented is None else float(augmented[constant])),
    )
    rows = tuple(row for row in found if row[1] is not None)
    note = say("corrected-intercept-note")
    return (Table("corrected_intercept", say("corrected-intercept-table"), columns, rows, note),)
