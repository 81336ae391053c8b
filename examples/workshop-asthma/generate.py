"""Makes records.csv: an invented case-control study of asthma among furniture makers, with the truth behind it.

A made-up trade of 60,000 people is drawn first; the cases are a sample of those with asthma and the controls a
sample of those without. The file is grouped: one line for all people who are alike. It is written beside this
script, the same bytes every time.
"""

from __future__ import annotations

import csv
from collections import Counter
from pathlib import Path

import numpy as np

SEED = 4
TRADE = 60_000
CASES, CONTROLS = 118, 236

TRUE_ODDS_RATIOS = {
    "dust: some against none": 1.50,
    "dust: heavy against none": 2.60,
    "smoking: former against never": 1.60,
    "smoking: current against never": 3.00,
    "age_band: 35 to 49 against under 35": 1.50,
    "age_band: 50 and over against under 35": 2.20,
}
"""The truth, each odds ratio conditional on the other columns. There is no interaction."""

BASELINE_LOG_ODDS = -4.6

DUST = ("none", "some", "heavy")
SMOKING = ("never", "former", "current")
AGE_BANDS = ("under 35", "35 to 49", "50 and over")


def chosen(rng: np.random.Generator, weights: np.ndarray) -> np.ndarray:
    """One of three levels for each row of weights (n, 3)."""
    cumulative = np.cumsum(weights, axis=1)
    drawn = rng.random(weights.shape[0]) * cumulative[:, -1]
    return np.asarray((drawn[:, None] > cumulative[:, :2]).sum(axis=1))


def people(rng: np.random.Generator) -> tuple[np.ndarray, ...]:
    """Dust, smoking, age band and asthma of the sampled people, as codes."""
    n = TRADE
    age = rng.choice(3, n, p=(0.40, 0.35, 0.25))
    # The old hands smoke more, and the smokers and the old hands stand at the dusty machines.
    smoking = chosen(rng, np.array([[0.60, 0.12, 0.28], [0.40, 0.25, 0.35], [0.25, 0.30, 0.45]])[age])
    dusty = 0.35 * age + np.array([0.0, 0.3, 0.9])[smoking]
    dust = chosen(rng, np.stack([np.ones(n), 0.55 * np.exp(0.6 * dusty), 0.16 * np.exp(1.3 * dusty)], axis=1))

    true = {name: float(np.log(ratio)) for name, ratio in TRUE_ODDS_RATIOS.items()}
    log_odds = (
        BASELINE_LOG_ODDS
        + np.array([0.0, true["dust: some against none"], true["dust: heavy against none"]])[dust]
        + np.array([0.0, true["smoking: former against never"], true["smoking: current against never"]])[smoking]
        + np.array([0.0, true["age_band: 35 to 49 against under 35"], true["age_band: 50 and over against under 35"]])[
            age
        ]
    )
    asthma = rng.random(n) < 1.0 / (1.0 + np.exp(-log_odds))
    cases = rng.permutation(np.flatnonzero(asthma))[:CASES]
    controls = rng.permutation(np.flatnonzero(~asthma))[:CONTROLS]
    sampled = np.concatenate([cases, controls])
    return dust[sampled], smoking[sampled], age[sampled], asthma[sampled]


def main() -> None:
    rng = np.random.Generator(np.random.PCG64(SEED))
    dust, smoking, age, asthma = people(rng)
    unknown = rng.random(asthma.size) < 0.03
    groups = Counter(
        (
            "case" if case else "control",
            DUST[d],
            "NA" if hidden else SMOKING[s],
            AGE_BANDS[a],
        )
        for case, d, s, a, hidden in zip(asthma, dust, smoking, age, unknown, strict=True)
    )
    order = {level: place for place, level in enumerate(("case", "control", *DUST, *SMOKING, "NA", *AGE_BANDS))}
    with (Path(__file__).parent / "records.csv").open("w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(("status", "dust", "smoking", "age_band", "people"))
        for levels in sorted(groups, key=lambda group: [order[level] for level in group]):
            writer.writerow((*levels, groups[levels]))


if __name__ == "__main__":
    main()
