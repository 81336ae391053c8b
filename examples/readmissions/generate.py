"""Makes records.csv: an invented network of four hospitals, with the truth that the records were drawn from.

Every name, number and person is invented. Run it from anywhere: it writes records.csv beside itself, the same
bytes every time.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np

SEED = 1107
RECORDS = 4_000

TRUE_ODDS_RATIOS = {
    "follow_up: not booked against booked": 1.40,
    "age, per 10 years": 1.10,
    "sex: male against female": 1.12,
    "admission: emergency against planned": 1.45,
    "dependency, per point": 1.26,
    "previous_admissions, per admission": 1.20,
    "length_of_stay, per doubling": 1.15,
    "smoking: former against never": 1.10,
    "smoking: current against never": 1.35,
    "living_alone: yes against no": 1.30,
    "ward: surgical against medical": 0.85,
    "ward: chest against medical": 1.25,
    "ward: burns against medical": 0.90,
    "hospital: any against any other": 1.00,
}
"""The truth, each odds ratio conditional on all the other columns. There is no interaction and no bend."""

BASELINE_LOG_ODDS = -4.20

HOSPITALS = ("Vesperly", "Ondale", "Marrowick", "Tessary")
WARDS = ("medical", "surgical", "chest", "burns", "respite")
HEADING = (
    "record", "hospital", "age", "sex", "smoking", "living_alone", "previous_admissions", "dependency",
    "admission", "ward", "length_of_stay", "follow_up", "readmitted",
)  # fmt: skip


def logistic(log_odds: np.ndarray) -> np.ndarray:
    return np.asarray(1.0 / (1.0 + np.exp(-log_odds)))


def people(rng: np.random.Generator) -> dict[str, np.ndarray]:
    """The records as they truly are, nothing missing."""
    n = RECORDS
    hospital = rng.choice(4, n, p=(0.34, 0.28, 0.22, 0.16))
    age = np.clip(np.rint(rng.normal(66, 16, n)), 16, 98)
    male = rng.random(n) < 0.47
    older = (age - 66) / 10
    smoking = np.where(rng.random(n) < 0.45, 0, np.where(rng.random(n) < logistic(-0.35 - 0.35 * older), 2, 1))
    alone = rng.random(n) < logistic(-0.95 + 0.28 * older)
    # Frail people are older, live alone more often, come as emergencies, stay longer and have been there before.
    frail = 0.55 * older + 0.35 * alone + 0.3 * (smoking == 2) + rng.normal(0, 1.25, n)
    dependency = np.clip(np.rint(3.1 + 1.5 * frail), 0, 10)
    previous = np.minimum(rng.poisson(np.exp(-0.75 + 0.38 * frail + rng.normal(0, 0.5, n))), 12)
    emergency = rng.random(n) < logistic(-0.1 + 0.45 * frail)
    ward = np.where(
        rng.random(n) < logistic(-0.3 - 0.9 * emergency),
        1,
        np.where(rng.random(n) < 0.27 + 0.1 * (smoking == 2), 2, 0),
    )
    rare = rng.random(n)
    ward = np.where(rare < 0.006, 3, np.where(rare < 0.009, 4, ward))
    stay = np.maximum(1, np.rint(np.exp(1.15 + 0.22 * frail + 0.3 * emergency + rng.normal(0, 0.75, n))))
    # What makes the crude odds ratio mislead: an appointment is booked less often for frail emergency patients.
    late = -1.0 + 0.28 * frail + 0.45 * emergency + 0.06 * previous + np.array([-0.3, 0.0, 0.35, 0.1])[hospital]
    not_booked = rng.random(n) < logistic(late)

    true = {name: float(np.log(ratio)) for name, ratio in TRUE_ODDS_RATIOS.items()}
    ward_effect = np.array(
        [
            0.0,
            true["ward: surgical against medical"],
            true["ward: chest against medical"],
            true["ward: burns against medical"],
            0.0,
        ]
    )
    smoking_effect = np.array([0.0, true["smoking: former against never"], true["smoking: current against never"]])
    log_odds = (
        BASELINE_LOG_ODDS
        + true["follow_up: not booked against booked"] * not_booked
        + true["age, per 10 years"] * age / 10
        + true["sex: male against female"] * male
        + true["admission: emergency against planned"] * emergency
        + true["dependency, per point"] * dependency
        + true["previous_admissions, per admission"] * previous
        + true["length_of_stay, per doubling"] * np.log2(stay)
        + smoking_effect[smoking]
        + true["living_alone: yes against no"] * alone
        + ward_effect[ward]
    )
    readmitted = rng.random(n) < logistic(log_odds)
    return {
        "hospital": np.array(HOSPITALS)[hospital],
        "age": age.astype(int).astype(str),
        "sex": np.where(male, "male", "female"),
        "smoking": np.array(["never", "former", "current"])[smoking],
        "living_alone": np.where(alone, "yes", "no"),
        "previous_admissions": previous.astype(str),
        "dependency": dependency.astype(int).astype(str),
        "admission": np.where(emergency, "emergency", "planned"),
        "ward": np.array(WARDS)[ward],
        "length_of_stay": stay.astype(int).astype(str),
        "follow_up": np.where(not_booked, "not booked", "booked"),
        "readmitted": np.where(readmitted, "yes", "no"),
    }


def faults(columns: dict[str, np.ndarray], rng: np.random.Generator) -> dict[str, np.ndarray]:
    """The same records as a ward clerk would hand them over: some values not recorded, some blanks too many.

    Whether a value is recorded depends on the other columns only, never on the outcome, so that the records
    complete for the model still carry the true odds ratios.
    """
    n = RECORDS
    columns = {name: values.astype(object) for name, values in columns.items()}
    planned = columns["admission"] == "planned"
    columns["smoking"][rng.random(n) < 0.045] = "NA"
    columns["living_alone"][rng.random(n) < 0.03] = ""
    columns["dependency"][rng.random(n) < np.where(planned, 0.07, 0.02)] = "NA"
    columns["age"][rng.random(n) < 0.006] = "999"
    columns["length_of_stay"][rng.random(n) < 0.005] = ""
    columns["follow_up"][rng.random(n) < 0.006] = "NA"
    columns["readmitted"][rng.random(n) < 0.007] = ""
    for name, share in (("sex", 0.01), ("ward", 0.006)):
        blank = rng.random(n) < share
        columns[name][blank] = columns[name][blank] + " "
    return columns


def main() -> None:
    rng = np.random.Generator(np.random.PCG64(SEED))
    columns = faults(people(rng), rng)
    columns["record"] = np.array([f"R{number:04d}" for number in range(1, RECORDS + 1)], dtype=object)
    with (Path(__file__).parent / "records.csv").open("w", newline="", encoding="utf-8") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(HEADING)
        writer.writerows(zip(*(columns[name] for name in HEADING), strict=True))


if __name__ == "__main__":
    main()
