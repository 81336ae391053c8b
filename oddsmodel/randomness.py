"""Seeds derived from what the numbers are for, never from a worker or an order of work."""

from __future__ import annotations

import hashlib

import numpy as np


def generator(seed: int, purpose: str, model: str = "", replicate: int = 0) -> np.random.Generator:
    """A random generator that depends on the plan's seed, the purpose, the model and the replicate only."""
    text = f"{seed}\x1f{purpose}\x1f{model}\x1f{replicate}".encode()
    return np.random.Generator(np.random.PCG64(int.from_bytes(hashlib.sha256(text).digest(), "big")))
