"""Random formulas of the language: patsy's matrix or a fault, and never anything else."""

from __future__ import annotations

from typing import Any

import numpy as np
import patsy
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from oddsmodel.errors import InputFault

FACTORS = st.sampled_from(
    ["age", "bmi", "smoking", "sex", "ward", "C(visits)", "C(sex, Sum)", "np.log(bmi)", "I(age / bmi)"]
)


def joined(parts: st.SearchStrategy[str]) -> st.SearchStrategy[str]:
    signs = st.sampled_from([" + ", ":", " * ", " / "])
    sums = st.tuples(parts, parts, st.sampled_from(["2", "3"]))
    return st.one_of(
        st.tuples(parts, signs, parts).map(lambda made: f"({''.join(made)})"),
        sums.map(lambda made: f"({made[0]} + {made[1]}) ** {made[2]}"),
        sums.map(lambda made: f"({made[0]} * {made[1]} - {made[1]})"),
    )


TERMS = st.recursive(FACTORS, joined, max_leaves=5)
SUMS = st.tuples(
    st.sampled_from(["", "0 + ", "1 + ", "-1 + "]),
    st.lists(TERMS, min_size=1, max_size=4),
    st.sampled_from(["", " - 1", " + 0"]),
).map(lambda made: made[0] + " + ".join(made[1]) + made[2])


@settings(
    deadline=None, derandomize=True, max_examples=250, suppress_health_check=[HealthCheck.function_scoped_fixture]
)
@given(SUMS)
def test_patsys_matrix_or_a_fault(clinic: Any, formula: str) -> None:
    try:
        design = clinic.design(formula, exposures=["sex"])
    except InputFault:
        return
    X = design.encode(clinic.frame)
    expected = np.asarray(patsy.dmatrix(formula, clinic.frame))
    np.testing.assert_allclose(X, np.broadcast_to(expected, X.shape), atol=1e-10)
    assert np.isfinite(X).all()
    assert len(design.columns) == X.shape[1] == len({column.name for column in design.columns})
    assert design.terms[-1].stop == X.shape[1]
    for term in design.terms:
        for column in design.columns[term.start : term.stop]:
            assert (column.term, column.sources) == (term.name, term.sources)
            assert (column.role == "exposure") == ("sex" in term.sources)
