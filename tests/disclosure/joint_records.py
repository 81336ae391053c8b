"""The joint table of the invented study, and the parts of it that its counts are sums over."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Mask = NDArray[np.bool_]

SMOKING = ("never", "former", "current")
SEX = ("female", "male")
AGE = ("under 40", "40 to 64", "65 and over")
SHAPE = (4, 3, 4, 2)
"""Smoking, sex, age band: the last place of each is "not recorded"; outcome: no, yes."""

BANDS = 18
CELLS = 96 + 2 * BANDS


def joint_table(seed: int, scale: float = 40.0) -> NDArray[np.int64]:
    """Invented numbers of records (132,): the joint table, then the bands; some cells crowded, some nearly empty."""
    random = np.random.default_rng(seed)
    share = np.einsum(
        "i,j,k->ijk",
        [0.6, 0.3, random.uniform(0.02, 0.12), 0.02],
        [0.55, 0.44, 0.01],
        [0.3, 0.4, random.uniform(0.02, 0.3), 0.02],
    )
    risk = np.array([0.08, 0.12, 0.2, 0.1])[:, None, None] * np.array([0.5, 1.0, 1.8, 1.0])[None, None, :]
    risk = np.broadcast_to(risk, share.shape)
    mean = scale * 20 * np.stack([share * (1 - risk), share * risk], axis=-1)
    joint = random.poisson(mean)
    rising = np.linspace(0.3, 1.7, BANDS)
    complete = joint[:3, :2, :3].sum(axis=(0, 1, 2))
    shares = [np.full(BANDS, 1 / BANDS), rising / rising.sum()]
    bands = [random.multinomial(number, share) for number, share in zip(complete, shares, strict=True)]
    return np.concatenate([joint.ravel(), np.stack(bands, axis=1).ravel()])


def index(axis: int, place: int | slice) -> Mask:
    mask = np.zeros(SHAPE, dtype=bool)
    mask[(slice(None),) * axis + (place,)] = True
    return np.concatenate([mask.ravel(), np.zeros(2 * BANDS, dtype=bool)])


def bands(start: int, stop: int, outcome: slice = slice(None)) -> Mask:
    """Complete records in bands of fitted risk, with either outcome or one."""
    mask = np.zeros((BANDS, 2), dtype=bool)
    mask[start:stop, outcome] = True
    return np.concatenate([np.zeros(96, dtype=bool), mask.ravel()])


def smoking(place: int) -> Mask:
    return index(0, place)


def sex(place: int) -> Mask:
    return index(1, place)


def age(place: int) -> Mask:
    return index(2, place)


EVENT = index(3, 1)
EVERYONE = index(3, slice(None))
HAS_SMOKING = index(0, slice(0, 3))
COMPLETE = HAS_SMOKING & index(1, slice(0, 2)) & index(2, slice(0, 3))
