"""The 2×2 table against scipy, exact fractions and published values."""

from __future__ import annotations

import math
import time
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq
from scipy.stats import nchypergeom_fisher
from scipy.stats.contingency import odds_ratio as reference_odds_ratio
from statsmodels.stats.contingency_tables import Table2x2

from oddsmodel.errors import InputFault
from oddsmodel.measures.two_by_two import LARGEST_SUPPORT, two_by_two
from oddsmodel.results.tables import Interval


def close(found: float | None, wanted: float, relative: float = 1e-9) -> None:
    assert found is not None
    assert math.isclose(found, wanted, rel_tol=relative), (found, wanted)


def test_oesophageal_cancer() -> None:
    # Breslow & Day 1980, chapter 4 (published-checks row 1).
    assert two_by_two(96, 109, 104, 666).odds_ratio == pytest.approx(5.640, abs=5e-4)


def test_aspirin_trial() -> None:
    # Agresti 2002, sections 2.2 and 3.1 (published-checks row 3).
    table = two_by_two(189, 11034 - 189, 104, 11037 - 104)
    assert table.odds_ratio == pytest.approx(1.832, abs=5e-4)
    assert table.log_standard_error == pytest.approx(0.123, abs=5e-4)
    assert table.woolf.lower == pytest.approx(1.440, abs=5e-4)
    assert table.woolf.upper == pytest.approx(2.331, abs=5e-4)


def test_smoking_and_lung_cancer() -> None:
    # Doll & Hill 1950, as in Agresti 2002 (published-checks row 4); a, c are cases.
    assert two_by_two(688, 650, 21, 59).odds_ratio == pytest.approx(2.97, abs=5e-3)


def test_tea_tasting() -> None:
    # Fisher 1935, as in Agresti 2002 section 3.5 (from memory): one-sided p 17/70, odds ratio 9; here doubled.
    table = two_by_two(3, 1, 1, 3)
    close(table.odds_ratio, 9.0)
    close(table.exact_p, 2 * 17 / 70)
    close(table.mid_p_p, 2 * (1 + 16 / 2) / 70)
    # By hand: the weights of x = 0..4 are 1, 16, 36, 16, 1; the estimate and limits are roots of polynomials in psi.
    weights = np.array([1.0, 16.0, 36.0, 16.0, 1.0])
    for found, polynomial in (
        (table.conditional, weights * (np.arange(5) - 3)),
        (table.exact.lower, weights * (np.arange(5) >= 3) - 0.025 * weights),
        (table.exact.upper, weights * (np.arange(5) <= 3) - 0.025 * weights),
    ):
        roots = np.roots(polynomial[::-1])
        positive = roots[(abs(roots.imag) < 1e-9) & (roots.real > 0)].real
        close(found, float(positive[0]), 1e-10)


@given(*[st.integers(1, 500)] * 4)
@settings(deadline=None, derandomize=True, max_examples=50)
def test_woolf_variance_and_symmetry(a: int, b: int, c: int, d: int) -> None:
    # Woolf 1955 (row 16): the variance is the sum of reciprocals, here in exact fractions.
    table = two_by_two(a, b, c, d)
    close(table.log_standard_error, math.sqrt(Fraction(1, a) + Fraction(1, b) + Fraction(1, c) + Fraction(1, d)), 1e-14)
    close(table.odds_ratio, Fraction(a * d, b * c), 1e-14)
    # Row 15: the odds ratio of exposure for outcome is that of outcome for exposure; so are all answers.
    turned = two_by_two(a, c, b, d)
    close(turned.odds_ratio, table.odds_ratio or 0.0, 1e-14)
    close(turned.conditional, table.conditional or 0.0, 1e-11)
    close(turned.exact.lower, table.exact.lower or 0.0, 1e-11)
    close(turned.mid_p.upper, table.mid_p.upper or 0.0, 1e-11)
    # Exposed and unexposed exchanged: reciprocals.
    other = two_by_two(c, d, a, b)
    close(other.conditional, 1 / (table.conditional or 0.0), 1e-11)
    close(other.exact.lower, 1 / (table.exact.upper or 0.0), 1e-11)
    close(other.exact_p, table.exact_p or 0.0, 1e-11)


def tables(number: int, largest: int, seed: int) -> list[tuple[int, int, int, int]]:
    random = np.random.default_rng(seed)
    return [tuple(int(cell) for cell in row) for row in random.integers(0, largest, size=(number, 4))]


@pytest.mark.parametrize("cells", tables(40, 12, 1) + tables(20, 150, 2))
def test_conditional_estimate_and_exact_limits_against_scipy(cells: tuple[int, int, int, int]) -> None:
    a, b, c, d = cells
    table = two_by_two(a, b, c, d, level=0.9)
    if 0 in (a + b, c + d, a + c, b + d):
        assert set(table.reasons) >= {"odds_ratio", "conditional", "exact", "mid_p"}
        return
    reference = reference_odds_ratio([[a, b], [c, d]], kind="conditional")
    limits = reference.confidence_interval(0.9)
    # scipy's own root finding stops at about 1e-12 in the odds ratio: held to 1e-9 of its size, or 1e-10 near 0.
    for found, wanted, key in (
        (table.conditional, reference.statistic, "conditional"),
        (table.exact.lower, limits.low, "exact.lower"),
        (table.exact.upper, limits.high, "exact.upper"),
    ):
        if wanted in (0.0, math.inf) or (key == "conditional" and 0 in cells):
            assert found is None
            assert table.reasons[key]
        else:
            assert found == pytest.approx(wanted, rel=1e-9, abs=1e-10)


@pytest.mark.parametrize("cells", [(3, 1, 1, 3), (7, 12, 5, 30), (60, 40, 20, 90)])
def test_mid_p_against_scipy_distribution(cells: tuple[int, int, int, int]) -> None:
    a, b, c, d = cells

    def upper_tail(psi: float) -> float:
        law = nchypergeom_fisher(a + b + c + d, a + b, a + c, psi)
        return float(law.sf(a) + 0.5 * law.pmf(a))

    lower = brentq(lambda psi: upper_tail(psi) - 0.025, 1e-3, 1e3, xtol=1e-12)
    upper = brentq(lambda psi: upper_tail(psi) - 0.975, 1e-3, 1e3, xtol=1e-12)
    table = two_by_two(a, b, c, d)
    close(table.mid_p.lower, lower, 1e-8)
    close(table.mid_p.upper, upper, 1e-8)
    # At psi = 1 by exact fractions of binomial coefficients.
    weights = {
        x: math.comb(a + b, x) * math.comb(c + d, a + c - x) for x in range(max(0, a - d), min(a + b, a + c) + 1)
    }
    above = sum(weight for x, weight in weights.items() if x > a) + Fraction(weights[a], 2)
    smaller = min(above, sum(weights.values()) - above)
    close(table.mid_p_p, 2 * smaller / sum(weights.values()), 1e-12)


def test_exact_p_agrees_with_limits() -> None:
    # At level 1 - p the nearer exact limit is 1 (both rest on the same tail).
    table = two_by_two(14, 6, 7, 13)
    assert table.exact_p is not None
    assert two_by_two(14, 6, 7, 13, level=1 - table.exact_p).exact.lower == pytest.approx(1.0, abs=1e-10)
    assert two_by_two(5, 5, 5, 5).exact_p == 1.0


@pytest.mark.parametrize("cells", [(5, 9, 11, 3), (120, 380, 90, 410)])
def test_woolf_against_statsmodels(cells: tuple[int, int, int, int]) -> None:
    a, b, c, d = cells
    reference = Table2x2([[a, b], [c, d]])
    table = two_by_two(a, b, c, d, level=0.99)
    lower, upper = reference.oddsratio_confint(0.01)
    close(table.odds_ratio, reference.oddsratio)
    close(table.woolf.lower, lower)
    close(table.woolf.upper, upper)


def test_zero_cells_have_reasons_and_one_sided_limits() -> None:
    table = two_by_two(0, 20, 5, 15)
    assert (table.odds_ratio, table.conditional, table.exact.lower, table.mid_p.lower) == (None, None, None, None)
    assert table.woolf == Interval(None, None)
    assert set(table.reasons) == {
        "odds_ratio", "log_standard_error", "woolf", "conditional", "exact.lower", "mid_p.lower",
    }  # fmt: skip
    limits = reference_odds_ratio([[0, 20], [5, 15]]).confidence_interval(0.95)  # scipy
    close(table.exact.upper, limits.high)
    infinite = two_by_two(20, 0, 15, 5)
    assert infinite.exact.upper is None
    assert "no finite upper limit" in infinite.reasons["exact.upper"]
    assert "infinite" in infinite.reasons["odds_ratio"]


def test_two_zero_cells_on_a_diagonal() -> None:
    # The only tables with these margins are extreme ones: one limit exists, the other does not.
    table = two_by_two(4, 0, 0, 4)
    assert table.exact.upper is None
    # By hand: P(X = 4; psi) = psi^4 / sum C(4,x)^2 psi^x = 0.025, root found on the fraction.
    wanted = brentq(lambda s: s**4 / sum(math.comb(4, x) ** 2 * s**x for x in range(5)) - 0.025, 1e-3, 1e3, xtol=1e-13)
    close(table.exact.lower, wanted)
    close(table.exact_p, 2 / 70)


@pytest.mark.parametrize(
    ("cells", "words"),
    [
        ((0, 0, 3, 4), "nobody is exposed"),
        ((3, 4, 0, 0), "everybody is exposed"),
        ((0, 4, 0, 3), "nobody has the event"),
        ((4, 0, 3, 0), "everybody has the event"),
    ],
)
def test_empty_margin(cells: tuple[int, int, int, int], words: str) -> None:
    table = two_by_two(*cells)
    assert table.exact_p is None
    assert words in table.reasons["exact_p"]


def test_large_tables_are_exact_and_fast() -> None:
    start = time.perf_counter()
    table = two_by_two(40_000, 60_000, 38_000, 62_000)
    assert time.perf_counter() - start < 2.0
    # Large-sample theory: the conditional estimate and Woolf's limits differ by order 1/n (Breslow & Day 1980, 4.2).
    close(table.conditional, table.odds_ratio or 0.0, 2e-5)
    close(table.mid_p.lower, table.woolf.lower or 0.0, 1e-5)
    close(table.mid_p.upper, table.woolf.upper or 0.0, 1e-5)


def test_large_unbalanced_table_against_exact_sums() -> None:
    # mpmath: sums of exact binomial coefficients at 50 digits, at the limits that were found.
    a, b, c, d = 300, 49_700, 200, 149_800
    table = two_by_two(a, b, c, d)
    with mpmath.workdps(50):
        weights = [mpmath.mpf(math.comb(a + b, x) * math.comb(c + d, a + c - x)) for x in range(a + c + 1)]

        def tail(psi: float, upper: bool) -> float:
            terms = [weight * mpmath.mpf(psi) ** x for x, weight in enumerate(weights)]
            return float((mpmath.fsum(terms[a:]) if upper else mpmath.fsum(terms[: a + 1])) / mpmath.fsum(terms))

        assert tail(table.exact.lower or 0.0, True) == pytest.approx(0.025, rel=1e-10)
        assert tail(table.exact.upper or 0.0, False) == pytest.approx(0.025, rel=1e-10)
        terms = [weight * mpmath.mpf(table.conditional) ** x for x, weight in enumerate(weights)]
        mean = mpmath.fsum(x * term for x, term in enumerate(terms)) / mpmath.fsum(terms)
        assert float(mean) == pytest.approx(a, abs=1e-9)


def test_above_the_largest_support_woolf_stands_alone() -> None:
    n = LARGEST_SUPPORT
    table = two_by_two(2 * n, 3 * n, 3 * n, 2 * n)
    assert table.odds_ratio is not None
    assert table.woolf.lower is not None
    assert table.exact == Interval(None, None)
    assert "Woolf" in table.reasons["exact"]


def test_faults_are_told_together() -> None:
    with pytest.raises(InputFault) as raised:
        two_by_two(-1, 2.5, True, 4, level=95)  # type: ignore[arg-type]
    assert [fault.where for fault in raised.value.faults] == ["cell a", "cell b", "cell c", "level"]
