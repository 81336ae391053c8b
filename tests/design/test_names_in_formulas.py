"""Columns may be called anything, and what a vetted formula holds."""

from __future__ import annotations

import pickle

import numpy as np
import pandas as pd
import pytest

from oddsmodel.design.encoder import build_design
from oddsmodel.design.formula import VettedFormula, vet_formula
from oddsmodel.errors import InputFault
from oddsmodel.records.types import Column

AWKWARD = [
    "C",
    "I",
    "Q",
    "log",
    "np",
    "Intercept",
    "class",
    "if",
    "True",
    "body mass",
    "pooled.stratum",
    "é",
    "cafe\u0301",
    "naïve ~ β",
    "2nd",
    'with "quotes"',
    "with 'single'",
    "back\\slash",
    "__class__",
    "a:b",
    "a*b",
    "1",
    "0",
    "rcs(age, 4)",
    "<b>x</b>",
    "年齢",
    "f0",
    "Treatment",
]


def vet(text: str, columns: list[str] | tuple[str, ...] | set[str]) -> VettedFormula:
    return vet_formula(text, columns=columns, outcome="died", where="formula")


def quoted(name: str) -> str:
    escaped = name.replace("\\", "\\\\").replace('"', '\\"')
    return f'Q("{escaped}")'


@pytest.mark.parametrize("name", AWKWARD, ids=ascii)
def test_any_name_in_quotation_marks(name: str) -> None:
    random = np.random.default_rng(1)
    frame = pd.DataFrame({name: random.normal(size=20), "other": random.normal(size=20)})
    columns = {one: Column(one, "number", one) for one in frame}
    formula = vet(f"{quoted(name)} * other + I({quoted(name)} ** 2) + exp({quoted(name)})", list(frame))
    assert formula.columns == (name, "other")
    design = build_design(formula, frame, columns, [name])
    x, other = frame[name].to_numpy(), frame["other"].to_numpy()
    expected = {
        "Intercept": np.ones(20),
        "product": x * other,
        "x": x,
        "other": other,
        "square": x**2,
        "exp": np.exp(x),
    }
    X = design.encode(frame)
    assert X.shape == (20, 6)
    for column in expected.values():
        assert any(np.allclose(column, X[:, place]) for place in range(6))
    assert len({column.name for column in design.columns}) == 6
    assert len({term.name for term in design.terms}) == 6
    assert [column.role for column in design.columns].count("intercept") == 1


@pytest.mark.parametrize(
    "name", ["C", "I", "Q", "log", "np", "Treatment", "Intercept", "class", "if", "True", "é", "__class__", "年齢"]
)
def test_bare_names(name: str) -> None:
    assert vet(f"{name} + log({name})", [name]).columns == (name,)


def test_a_name_is_a_column_unless_called() -> None:
    formula = vet("log + log(log) + np.log(np) + np + C(C) + Q('Q') + Q", ["log", "np", "C", "Q"])
    texts = [formula.factors[place].text for (place,) in formula.terms]
    assert texts == ["log", "log(log)", "log(np)", "np", "C(C)", "Q"]


def test_accents_stored_otherwise() -> None:
    """NFC and NFD spellings of one name meet; two columns that differ in nothing else must be spelled exactly."""
    assert vet("cafe\u0301", ["caf\u00e9"]).columns == ("caf\u00e9",)
    assert vet("caf\u00e9", ["cafe\u0301"]).columns == ("cafe\u0301",)
    both = ["caf\u00e9\u0323", "cafe\u0301\u0323"]
    assert vet(quoted(both[0]), both).columns == (both[0],)
    with pytest.raises(InputFault, match="told apart only by how their accents are stored"):
        vet(quoted("cafe\u0323\u0301"), both)
    with pytest.raises(InputFault, match="outcome"):
        vet_formula("e\u0301", columns=["\u00e9"], outcome="\u00e9", where="formula")


def test_lookalike_is_another_name() -> None:
    with pytest.raises(InputFault, match="no column"):
        vet("\u0430ge", ["age"])


def test_left_side() -> None:
    for text in ("died ~ a", "Q('died') ~ a", "~ a", "a", " died~a "):
        assert vet(text, ["a", "died"]).columns == ("a",)
    assert vet_formula("Q('a ~ b') ~ a", columns=["a"], outcome="a ~ b", where="formula").columns == ("a",)


def test_columns_are_those_of_the_terms_left() -> None:
    assert vet("a + b * c - b - b:c", ["a", "b", "c"]).columns == ("a", "c")
    assert vet("c + a", {"a", "b", "c"}).columns == ("c", "a")
    assert vet("1", ["a"]).columns == ()
    assert vet("0 + a", ["a"]).intercept is False


def test_nearest_name() -> None:
    with pytest.raises(InputFault) as caught:
        vet("smokr + Q('body mas')", ["smoker", "body mass"])
    assert [fault.remedy for fault in caught.value.faults] == ["Did you mean “smoker”?", "Did you mean “body mass”?"]


def test_own_words() -> None:
    written = {
        "rcs( age ,4 )": "rcs(age, 4)",
        "C(b,Treatment('x y'))": 'C(b, Treatment(reference="x y"))',
        "C(b, levels=['x', 2])": 'C(b, levels=["x", "2"])',
        "I(age**2/(b-1)-3)": "I(age ** 2 / (b - 1) - 3)",
        "I(-(age+b)*2)": "I(-(age + b) * 2)",
        "I((-age)**2)": "I((-age) ** 2)",
        "I(age-(b-1))": "I(age - (b - 1))",
        "I(age/(b*2))": "I(age / (b * 2))",
        "np.log2(age+1)": "log2(age + 1)",
        "cut(age,[40,60.5])": "cut(age, [40, 60.5])",
        "bs(age,degree=2,df=4)": "bs(age, df=4, degree=2)",
        "cc(age,4,constraints='center')": 'cc(age, df=4, constraints="center")',
    }
    for text, words in written.items():
        formula = vet(text, ["age", "b"])
        assert formula.factors[0].text == words
        again = vet(words, ["age", "b"])
        assert again.factors == formula.factors


def test_pickles() -> None:
    formula = vet("died ~ rcs(age, 4) * C(b, Sum) + I(age ** 2)", ["age", "b"])
    assert pickle.loads(pickle.dumps(formula)) == formula
