"""Ratios of the engine against statsmodels and scikit-learn, side by side in one process.

Run: python tests/benchmarks/engine.py [--quick] [--records 10000 100000 ...] [--columns 17 60] [--runs 5]
The whole table takes about half an hour on two idle cores; --quick takes seconds, on few records.
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from made import KINDS, Kind, records
from others import FITS, limit_by_refitting
from scipy.stats import chi2
from timing import machine, side_by_side

from oddsmodel.inference import Fit, maximise, profile_intervals
from oddsmodel.likelihood import BinomialLikelihood

REFITTED = 2
"""So many limits are found by refitting; the time for all is that of these, multiplied."""


@dataclass(frozen=True)
class Row:
    """Times in seconds, and the largest differences from our numbers in standard errors."""

    number: int
    kind: Kind
    columns: int
    fit: float
    limits: float
    others: dict[str, float]
    differences: dict[str, float]
    refitting: float
    limit_difference: float


def measure(number: int, kind: Kind, columns: int, runs: int) -> Row:
    """All fits and limits of one data set."""
    X, y = records(kind, number, columns)
    fit = maximise(BinomialLikelihood(X, y))
    works = {name: (lambda work=work: work(X, y)) for name, work in FITS.items()}
    works["fit"] = lambda: maximise(BinomialLikelihood(X, y))
    works["limits"] = lambda: profile_intervals(fit)
    times = side_by_side(works, runs)
    lower, upper = times["limits"].answer
    refitted = side_by_side({"refitting": lambda: _refit(X, y, fit)}, 1)["refitting"]
    ours = np.array([lower[1], upper[-1]])
    return Row(
        number,
        kind,
        columns,
        times["fit"].seconds,
        times["limits"].seconds,
        {name: times[name].seconds for name in FITS},
        {name: float(np.abs((times[name].answer - fit.coefficients) / fit.standard_errors).max()) for name in FITS},
        refitted.seconds * 2 * columns / REFITTED,
        float(np.abs((refitted.answer - ours) / fit.standard_errors[[1, -1]]).max()),
    )


def _refit(X: np.ndarray, y: np.ndarray, fit: Fit) -> np.ndarray:
    """The lower limit of the second coefficient and the upper one of the last."""
    height = fit.log_likelihood - chi2.ppf(0.95, 1) / 2
    return np.array(
        [
            limit_by_refitting(X, y, fit.coefficients, fit.standard_errors[j], height, j, sign)
            for j, sign in ((1, -1.0), (X.shape[1] - 1, 1.0))
        ]
    )


def heading() -> str:
    others = "".join(f"{name.removeprefix('scikit-learn ').removeprefix('statsmodels '):>24}" for name in FITS)
    last = f"{'all limits':>12}{'of a Logit fit':>16}{'refitting':>20}"
    return f"{'records':>9}  {'columns':24}{'our fit':>10}{others}{last}"


def line(row: Row) -> str:
    """Our times in seconds; the others as multiples of our fit, with their difference in standard errors."""
    others = "".join(f"{row.others[name] / row.fit:>14.1f} ({row.differences[name]:.0e})" for name in FITS)
    return (
        f"{row.number:>9,}  {f'{row.columns}, {row.kind}':24}{row.fit:>9.4f}s{others}"
        f"{row.limits:>11.4f}s{row.limits / row.others['statsmodels Logit']:>16.2f}"
        f"{row.refitting / row.limits:>12.0f} ({row.limit_difference:.0e})"
    )


def bars(row: Row) -> list[str]:
    """What the engine must reach on a million mixed records with 17 columns."""
    logit = row.others["statsmodels Logit"]
    found = (
        ("fit, times faster than statsmodels Logit", logit / row.fit, 6.0, True),
        ("fit, times faster than newton-cholesky", row.others["scikit-learn newton-cholesky"] / row.fit, 2.5, True),
        ("all profile limits, of one Logit fit", row.limits / logit, 0.8, False),
        ("all profile limits, times faster than refitting", row.refitting / row.limits, 150.0, True),
    )
    return [
        f"  {name:50}{value:10.2f}   {'at least' if least else 'at most'} {bar:g}: "
        f"{'reached' if (value >= bar) == least else 'NOT REACHED'}"
        for name, value, bar, least in found
    ]


def main(arguments: Sequence[str] | None = None) -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--quick", action="store_true")
    parser.add_argument("--records", type=int, nargs="+", default=[10_000, 100_000, 1_000_000])
    parser.add_argument("--columns", type=int, nargs="+", default=[17, 60])
    parser.add_argument("--runs", type=int, default=5)
    asked = parser.parse_args(arguments)
    numbers, widths, runs = (asked.records, asked.columns, asked.runs) if not asked.quick else ([2_000], [5], 1)
    print(f"Medians of {runs} runs, one after another in turn; work of more than 20 s is done once. {machine()}")
    print("Others: multiples of the time of our fit (largest difference from it in standard errors).")
    print(f"Refitting: {REFITTED} limits by statsmodels Logit with an offset, their time multiplied to all limits,")
    print("as a multiple of the time of our limits (largest difference from them in standard errors).")
    print(heading())
    for number in numbers:
        for columns in widths:
            for kind in KINDS:
                row = measure(number, kind, columns, runs)
                print(line(row), flush=True)
                if (number, columns, kind) == (1_000_000, 17, "mixed"):
                    print("\n".join(bars(row)), flush=True)


if __name__ == "__main__":
    main()
