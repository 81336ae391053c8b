"""Make the two quarters of an invented, untidy extract: births by ward side, as a hospital's system might write it.

Run: python generate.py  (writes first-quarter.csv and second-quarter.csv beside this file)

Untidy on purpose: a byte-order mark, semicolons with a decimal comma, spaces after ward names, 9 and 99 for "not
recorded", a parity of 88 that nobody can have, birthdays in two ways of writing, and in the second quarter a ward that
the first did not have.
"""

from __future__ import annotations

import csv
import math
import random
from datetime import date, timedelta
from pathlib import Path

TRUE_ODDS_RATIOS = {"side": 1.8, "age": 1.25, "illness": 1.5}
"""Of a transfusion: high-risk side against low-risk, per 5 years of age, per point of the illness score."""

HEADER = [
    "record",
    "born",
    "admitted",
    "Parity (n)",
    "BMI at booking",
    "ward",
    "diabetes",
    "hypertension",
    "transfused",
]


def quarter(first_day: date, wards: dict[str, float], seed: int, records: int = 1100) -> list[list[str]]:
    """The rows of a quarter; wards with the share of the records each has."""
    draw = random.Random(seed)
    rows = []
    for number in range(1, records + 1):
        admitted = first_day + timedelta(days=draw.randrange(90))
        age = min(max(draw.gauss(31, 6), 16), 48)
        born = admitted - timedelta(days=round(age * 365.25))
        parity = min(int(draw.expovariate(0.9)), 9)
        mass = round(min(max(draw.gauss(26, 5), 15), 52), 1)
        ward = draw.choices(list(wards), list(wards.values()))[0]
        diabetes, hypertension = draw.random() < 0.1, draw.random() < 0.15
        log_odds = -2.2 + math.log(TRUE_ODDS_RATIOS["side"]) * (ward in ("H1", "H2"))
        log_odds += math.log(TRUE_ODDS_RATIOS["age"]) * (age - 31) / 5
        log_odds += math.log(TRUE_ODDS_RATIOS["illness"]) * (2 * diabetes + hypertension)
        transfused = draw.random() < 1 / (1 + math.exp(-log_odds))
        rows.append(
            [
                f"{first_day.year}-{number:04d}",
                born.isoformat() if draw.random() < 0.3 else born.strftime("%d/%m/%Y"),
                admitted.isoformat(),
                draw.choices([str(parity), "99", "88"], [0.96, 0.03, 0.01])[0],
                "" if draw.random() < 0.03 else f"{mass}".replace(".", ","),
                ward + " " * draw.choice([0, 0, 1, 3]),
                "9" if draw.random() < 0.02 else "yes" if diabetes else "no",
                "9" if draw.random() < 0.02 else "yes" if hypertension else "no",
                "yes" if transfused else "no",
            ]
        )
    return rows


def write(name: str, rows: list[list[str]]) -> None:
    with (Path(__file__).parent / name).open("w", encoding="utf-8-sig", newline="") as file:
        writer = csv.writer(file, delimiter=";", lineterminator="\n")
        writer.writerows([HEADER, *rows])


if __name__ == "__main__":
    write("first-quarter.csv", quarter(date(2025, 1, 1), {"H1": 0.2, "H2": 0.15, "L1": 0.4, "L2": 0.25}, 11))
    write(
        "second-quarter.csv",
        quarter(date(2025, 4, 1), {"H1": 0.2, "H2": 0.15, "L1": 0.35, "L2": 0.2, "Birth centre": 0.1}, 12),
    )
