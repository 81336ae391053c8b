"""Hostile and mistaken formulas: refused by name, quickly, with nothing evaluated."""

from __future__ import annotations

import contextlib
import time

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from oddsmodel.design.formula import VettedFormula, vet_formula
from oddsmodel.errors import InputFault

COLUMNS = ("a", "b", "c", "x", "y", "z", "my col", "pooled.stratum", "os", "C", "log", "np")

HOSTILE = [
    # Running code.
    "__import__('os')",
    "__import__('os').system('true')",
    "eval('1')",
    "exec('import os')",
    "open('/etc/passwd')",
    "os.system('true')",
    "os.path",
    "a.__class__",
    "a.__class__.__mro__[1].__subclasses__()",
    "().__class__",
    "(a).__class__",
    "''.__class__",
    "'a'.join(b)",
    "[].append(a)",
    "log.__globals__",
    "np.linalg.inv(a)",
    "np.load('x')",
    "np.random.normal(a)",
    "np.log.__call__(a)",
    "np.log",
    "I(a.values)",
    "I(__import__('os'))",
    "C(__import__('os'))",
    "Q(__import__('os'))",
    "Q('a'.upper())",
    "log(open('x'))",
    "C(a, Treatment(reference=open('x')))",
    "C(a, levels=open('x'))",
    "rcs(x, eval('3'))",
    "getattr(a, 'b')",
    "globals()",
    "print(a)",
    "log(a)(b)",
    "(log)(a)",
    "log(log)(a)",
    "a()",
    # Other parts of Python.
    "f'{a}'",
    'f"{__import__(1)}"',
    "rb'x'",
    "u'x'",
    "Q(f'{a}')",
    "lambda: 0",
    "lambda a: a",
    "log(lambda: a)",
    "[i for i in x]",
    "I([i for i in x])",
    "log(i for i in x)",
    "{a}",
    "{a: b}",
    "{i for i in x}",
    "x if y else z",
    "log(x if y else z)",
    "a and b",
    "not a",
    "a in b",
    "a is b",
    "(a := 3)",
    "a := 3",
    "a = 3",
    "a == b",
    "I(a == b)",
    "I(a > 3)",
    "a < b",
    "a != b",
    "a <= b",
    "log(*a)",
    "log(**a)",
    "C(*a, **b)",
    "log(a, b)",
    "log(x, base=2)",
    "C(a, Treatment, Sum, Poly)",
    "C(a, contrast=Sum, contrast=Poly)",
    "C(a, Sum, contrast=Poly)",
    "rcs(x, k=4)",
    "a[0]",
    "a['b']",
    "a[1:2]",
    "[a]",
    "[]",
    "()",
    "(a, b)",
    "a,",
    "a, b",
    "...",
    "a @ b",
    "a // b",
    "a % b",
    "a %in% b",
    "a ^ 2",
    "a & b",
    "a | b",
    "a || b",
    "(1 | a)",
    "~~a",
    "a ~ b ~ c",
    "!a",
    "?a",
    "$a",
    "a$b",
    "a -> b",
    "await a",
    "yield a",
    "import os",
    "from os import path",
    "del a",
    "assert a",
    "a; b",
    "a;import os",
    "a\nimport os",
    "a # b",
    "# a",
    "a \\ b",
    "a \\\n + b",
    "`a`",
    "True",
    "None",
    "a + True",
    # Text that is no text.
    "a\x00",
    "\x00",
    "a\x00+b",
    "Q('a\x00')",
    "a\x07b",
    "a\u200bb",
    "a\u00a0+ b",
    "\ufeffa",
    "\u202ea",
    "ａ",
    "ｌｏｇ(a)",
    "а + b",
    "log\u2024a",
    "a＋b",
    "“a”",
    "Q(“a”)",
    "a − b",
    "a – b",
    "a × b",
    "a ² ",
    "a²",
    "①",
    "٣",
    "I(a ** ٣)",
    "'a",
    "Q('a",
    "Q('a\nb')",
    "Q('''a''')",
    "Q('a' 'b')",
    "Q('\\x61')",
    "Q('\\N{BULLET}')",
    "\ud800",
    # Numbers.
    "1e400",
    "I(a * 1e400)",
    "I(a * 9" + "9" * 400 + ")",
    "9" * 4000,
    "0x10",
    "1_000",
    "1j",
    "I(a * 1j)",
    "12abc",
    "2",
    "a + 2",
    "2 * a",
    "a * 0",
    "a:1",
    "a / 10",
    "1.0",
    "I(2)",
    "log(2)",
    "I(1 / 0 + a)",
    "I(a / 0)",
    "I(a / (1 - 1))",
    "I((0 - 8) ** 0.5 * a)",
    "I(0 ** -1 + a)",
    # More than there can be.
    "a ** 1000000000",
    "(a + b) ** 1000000000",
    "(a + b + c) ** 20",
    "(a + b) ** 1e9",
    "(a + b) ** 2.5",
    "(a + b) ** 0",
    "(a + b) ** -1",
    "(a + b) ** c",
    "(a + b) ** (2)**9",
    "a ** 2",
    "I(a ** 1000000000)",
    "I(a ** 9 ** 9 ** 9)",
    "I(a ** b)",
    "I(2 ** a)",
    "I(a ** -11)",
    "I((10 ** 10) ** 10 * a)",
    "I(((1e12 ** 10) ** 10) ** 10 * a)",
    "bs(x, df=1000000000)",
    "bs(x, df=4, degree=1000)",
    "bs(x, df=2)",
    "bs(x, df=4.5)",
    "bs(x, df=a)",
    "bs(x)",
    "bs(x, knots=[3, 2])",
    "bs(x, knots=[1, 1])",
    "bs(x, knots=[])",
    "bs(x, knots=[a])",
    f"bs(x, knots=[{', '.join(map(str, range(1000)))}])",
    "bs(x, df=5, knots=[1])",
    "bs(x, df=4, include_intercept=True)",
    "cr(x, df=100)",
    "cr(x, df=2)",
    "cr(x, df=4, constraints='none')",
    "cr(x, df=4, constraints=[[1]])",
    "cc(x, knots=[1])",
    "te(cr(x, 4), cr(y, 4))",
    "rcs(x)",
    "rcs(x, 2)",
    "rcs(x, 8)",
    "rcs(x, 1000000000)",
    "rcs(x, [1, 2])",
    "rcs(x, 4, 5)",
    "cut(x)",
    "cut(x, 4)",
    "cut(x, [])",
    "cut(x, [2, 1])",
    f"cut(x, [{', '.join(map(str, range(1000)))}])",
    f"C(a, levels=[{', '.join(map(str, range(1000)))}])",
    "C(a, levels=['u'])",
    "C(a, levels=['u', 'u'])",
    "C(a, Treatment(reference='w'), levels=['u', 'v'])",
    "C(a, Helmert)",
    "C(a, Sum(omit='u'))",
    "C(a, Poly([1, 2]))",
    "C(a, Treatment('u', 'v'))",
    "C(a, b)",
    "C()",
    "C(a + b)",
    "C(log(a))",
    "Treatment(a)",
    "scale(a)",
    "offset(a)",
    "poly(a, 2)",
    "(" * 2000 + "a" + ")" * 2000,
    "[" * 2000,
    "I(" * 1200 + "a" + ")" * 1200,
    "log(" * 900 + "a" + ")" * 900,
    "- " * 2400 + "a",
    "a + " + "- " * 2000 + "1",
    "I(" + "-" * 2000 + "a)",
    "a ** " * 900 + "2",
    "I(" + "a * " * 1000 + "a)",
    "a:" * 2000 + "b",
    "*".join("abcxyz") + "*C*log*np*os",
    ":".join("abcxyz") + ":C",
    "(a + b + c + x + y + z + C + log + np) ** 6 * (a + b)",
    "+".join(f"({'+'.join('abcxyz')}) ** 6 : ({'*'.join('abcxyz')})" for _ in range(60)),
    "*".join(["(a*b*c*x*y*z)"] * 300),
    "a" * 6000,
    "+" * 4000,
    # No formula.
    "",
    "   ",
    "\n",
    "~",
    "died ~",
    "a +",
    "+",
    "* a",
    "a b",
    "a 'b'",
    "my col",
    "a + + * b",
    "(a + b",
    "a + b)",
    "(a]",
    "log(a",
    "a)(b",
    "'a'",
    "log",
    "0",
    "-1",
    "0 + 0",
    # What means something else than it seems, or nothing.
    "-a",
    "- a + b",
    "a + -1",
    "a + -b",
    "a + (b + 0)",
    "a + (b - 1)",
    "a - (b + 0)",
    "(a + 1):b",
    "(a + 0) * b",
    "a - z",
    "a * a",
    "a:a",
    "log(a) * log(a)",
    "I(a:b)",
    "I('a')",
    "I([1])",
    "I(C(a))",
    "log(rcs(x, 3))",
    "center()",
    "standardize(a, ddof=1)",
    "Q(a)",
    "Q()",
    "Q('a', 'b')",
    # Names.
    "pooled.stratum",
    "d",
    "Q('nobody')",
    "died",
    "a + died",
    "log(died)",
    "Q('died')",
    "died ~ died",
    "a ~ b",
    "log(died) ~ a",
    "died + a ~ b",
    "1 ~ a",
    "Q('a') ~ b",
]
HARMLESS_AMONG_THEM = {"log"}


@pytest.mark.parametrize(
    "text", [text for text in HOSTILE if text not in HARMLESS_AMONG_THEM], ids=lambda text: ascii(text)[:40]
)
def test_refused(text: str) -> None:
    start = time.perf_counter()
    with pytest.raises(InputFault) as caught:
        vet_formula(text, columns=COLUMNS, outcome="died", where="[[models]] formula")
    assert time.perf_counter() - start < 2.0
    for fault in caught.value.faults:
        assert fault.where.startswith("[[models]] formula")
        assert fault.what
        assert fault.remedy
        assert len(fault.what) < 400
        assert "\x00" not in str(fault)
        assert "{" not in fault.remedy


def test_says_what_and_where() -> None:
    with pytest.raises(InputFault) as caught:
        vet_formula("died ~ a + smoke + b.real + zz(c)", columns=(*COLUMNS, "smoker"), outcome="died", where="formula")
    (fault,) = caught.value.faults
    assert fault.where == "formula, character 20"
    assert fault.what == (
        "“b.real” reaches into something with a full stop (an attribute), which a formula cannot hold. "
        "Nothing of it was run."
    )
    assert fault.remedy.startswith('A column whose name has a full stop in it is written Q("its.name").')


def test_faults_of_all_terms_together() -> None:
    with pytest.raises(InputFault) as caught:
        vet_formula("a + smoke + zz(c) + I(b ** 99)", columns=(*COLUMNS, "smoker"), outcome="died", where="formula")
    assert [fault.where for fault in caught.value.faults] == [
        "formula, character 5",
        "formula, character 13",
        "formula, character 28",
    ]
    assert caught.value.faults[0].remedy == "Did you mean “smoker”?"


NAMES = ["a", "b", "x", "died", "levels", "if", "for", "lambda", "é", "\u0301", "Ｌ", "__class__"]
CALLS = ["log(", "C(", "Q(", "I(", "rcs(", "cut(", "bs(", "np.log(", "Treatment(", "reference=", "Sum", "df=", "knots="]
SIGNS = [
    "+",
    "-",
    "*",
    "/",
    "**",
    ":",
    "~",
    "(",
    ")",
    "[",
    "]",
    ",",
    "=",
    ".",
    "..",
    ";",
    "#",
    "\\",
    "`",
    "{",
    "@",
    "!",
]
CONSTANTS = ["0", "1", "2", "3.5", "1e3", "'a'", '"my col"', "'", " ", "\n", "\x00"]
PIECES = st.sampled_from([*NAMES, *CALLS, *SIGNS, *SIGNS, *CONSTANTS])


def vetted_or_refused(text: str) -> None:
    start = time.perf_counter()
    found: VettedFormula | None = None
    with contextlib.suppress(InputFault):
        found = vet_formula(text, columns=COLUMNS, outcome="died", where="formula")
    assert found is None or set(found.columns) <= set(COLUMNS)
    assert time.perf_counter() - start < 2.0


@settings(deadline=None, derandomize=True, max_examples=600)
@given(st.lists(PIECES, max_size=30).map("".join))
def test_pieces_of_formulas_in_any_order(text: str) -> None:
    vetted_or_refused(text)


@settings(deadline=None, derandomize=True, max_examples=300)
@given(st.text(max_size=200))
def test_any_text(text: str) -> None:
    vetted_or_refused(text)


def test_many_unknown_columns_of_many() -> None:
    """The nearest name is sought for a few of them only."""
    columns = [f"measurement_{number}_of_the_kidney" for number in range(4000)]
    text = " + ".join(f"measurement{number}" for number in range(300))
    start = time.perf_counter()
    with pytest.raises(InputFault) as caught:
        vet_formula(text, columns=columns, outcome="died", where="formula")
    assert 1 <= len(caught.value.faults) <= 10
    assert time.perf_counter() - start < 10.0
