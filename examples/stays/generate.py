"""Invent an untidy register of hospital stays, several of the same people, with dates of admission, death and contact.

Run: python examples/stays/generate.py

What is untidy: the register writes days first with points, the office for deaths years first, and both leave spaces
behind; cells are separated by semicolons after a byte-order mark; stays are sent twice; age 999 means that it is not
known; smoking became commoner over the years, so that late entrants are exposed more often.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd

TRUE_ODDS_RATIOS = {"smoker": 2.43}
"""Death within 365 days of the first stay: risks of 15% and 30%."""

PEOPLE, STAYS_SENT_TWICE = 2600, 15
FIRST_DAY, EXTRACTED = np.datetime64("2021-07-01"), np.datetime64("2025-03-31")
RISKS = {"no": 0.15, "yes": 0.30}
LOST_A_DAY = 1 / 9000


def invent() -> pd.DataFrame:
    rng = np.random.default_rng(20261201)
    days = int((EXTRACTED - FIRST_DAY).astype(int))
    first = rng.integers(0, days, PEOPLE)
    smoker = np.where(rng.random(PEOPLE) < 0.15 + 0.6 * first / days, "yes", "no")
    age = rng.integers(18, 95, PEOPLE)
    risk = np.vectorize(RISKS.get)(smoker)
    death = first + np.floor(rng.exponential(-365 / np.log1p(-risk))).astype(int)
    lost = first + np.floor(rng.exponential(1 / LOST_A_DAY, PEOPLE)).astype(int)
    seen = np.minimum(np.minimum(lost, days), death)

    # Later stays of a third of the people, while they were seen.
    again = np.flatnonzero((rng.random(PEOPLE) < 0.33) & (seen > first + 20))
    later = rng.integers(first[again] + 10, seen[again])
    person = np.concatenate([np.arange(PEOPLE), again])
    admitted = np.concatenate([first, later])

    frame = pd.DataFrame(
        {
            "stay": "",
            "patient": [f"{number:05d}" for number in person * 7 + 11],
            "admitted": pd.Series(pd.to_datetime(FIRST_DAY + admitted)).dt.strftime("%d.%m.%Y "),
            "died on": pd.Series(np.datetime_as_string(FIRST_DAY + death)).where(death <= seen, "").to_numpy()[person],
            "last seen": pd.Series(pd.to_datetime(FIRST_DAY + seen)).dt.strftime("%d.%m.%Y").to_numpy()[person],
            "smoker": np.where(rng.random(PEOPLE) < 0.02, " ", smoker)[person],
            "age": np.where(rng.random(PEOPLE) < 0.02, 999, age)[person],
            "infection": rng.choice(["yes", "no", ""], len(person), p=[0.12, 0.85, 0.03]),
        }
    )
    frame = frame.iloc[rng.permutation(len(frame))].reset_index(drop=True)
    frame["stay"] = [f"S{number:05d}" for number in range(len(frame))]
    return pd.concat([frame, frame.iloc[:STAYS_SENT_TWICE]], ignore_index=True)


def main() -> None:
    path = Path(__file__).parent / "records.csv"
    invent().to_csv(path, index=False, sep=";", encoding="utf-8-sig", lineterminator="\n")


if __name__ == "__main__":
    main()
