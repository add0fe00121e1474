"""Multisets: what several alike parties may have between them, and how likely it is."""

from __future__ import annotations

import math
from functools import lru_cache
from typing import Any

import numpy as np
import numpy.typing as npt

ROOM = 2**62
"""Weights below this are held in int64."""

Ints = npt.NDArray[Any]


@lru_cache(maxsize=8)
def multisets(size: int, masses: tuple[int, ...]) -> tuple[Ints, Ints]:
    """All multisets of `size` parties: how many have each row, (M, rows), and their weights (M,).

    The weight is size! / prod n_c! * prod masses_c**n_c, found as a product of binomials.
    """
    kind: Any = np.int64 if sum(masses) ** size < ROOM else object
    left = np.array([size], dtype=np.int64)
    columns: list[Ints] = []
    weights: Ints = np.ones(1, dtype=kind)
    binomial = np.array(
        [[math.comb(n, j) for j in range(size + 1)] for n in range(size + 1)], dtype=object
    ).astype(kind)
    for mass in masses[:-1]:
        copies = left + 1
        start = np.cumsum(copies) - copies
        own = np.arange(int(copies.sum()), dtype=np.int64) - np.repeat(start, copies)
        columns = [np.repeat(column, copies) for column in columns]
        left = np.repeat(left, copies)
        powers = np.array([mass**n for n in range(size + 1)], dtype=object).astype(kind)
        weights = np.repeat(weights, copies) * binomial[left, own] * powers[own]
        columns.append(own)
        left = left - own
    last = np.array([masses[-1] ** n for n in range(size + 1)], dtype=object).astype(kind)
    numbers, weights = np.stack([*columns, left], axis=1), weights * last[left]
    numbers.flags.writeable = weights.flags.writeable = False
    return numbers, weights
