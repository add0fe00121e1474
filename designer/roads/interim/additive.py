"""A lexicographic rule as one additive integer index, and such sums in machine words.

A lexicographic pair becomes first * R + second with R above the range of the second, so one
sum per option decides. Where sums do not fit 64 bits they are kept as limbs: limb l of a sum
is the sum of limbs l, and carries are settled when sums are compared.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from designer.roads.interim.rule import Index, Rule
from designer.setting.setting import IntArray

ROOM = 2**61
LIMB = 40
"""Bits per limb where index sums do not fit 64 bits."""

TOP = 60
"""Bits of the first limb there."""

Words = list[npt.NDArray[np.int64]]
"""Integers, most significant limb first; one limb where they fit 64 bits."""


@dataclass(frozen=True, eq=False)
class Additive:
    """The option with the largest options[k] + sum_i parties[i][a_i, k]; ties go to the first.

    parties  per party, int, shape (T_i, K), 0 at the first option and at the first type
    options  int, shape (K,), 0 at the first
    Python ints, or int64 where 4 * reach + 4 is below ROOM.
    """

    parties: tuple[IntArray, ...]
    options: IntArray

    @property
    def reach(self) -> int:
        """No sum, and no difference of two sums, is larger in absolute value."""
        return 2 * sum(_largest(table) for table in (*self.parties, self.options))


def additive(rule: Rule) -> Additive:
    """The rule's indices in one. Raises ValueError for the given table, which has none."""
    if not rule.indices:
        raise ValueError("the given table has no index")
    tables: list[IntArray] = []
    short = len(rule.indices) == 1 and _short(rule.indices[0])
    for index in rule.indices:
        lower = _relative(index, np.dtype(np.int64 if short else object))
        span = 2 * sum(_largest(t) for t in lower) + 1
        tables = (
            [t * span + u for t, u in zip(tables, lower, strict=True)] if tables else list(lower)
        )
    shared = math.gcd(*(math.gcd(*t.ravel().tolist()) for t in tables)) or 1
    tables = [t // shared for t in tables]
    return Additive(tuple(tables[:-1]), tables[-1][0])


def _short(index: Index) -> bool:
    """Whether 64 bits hold every number on the way: those of `_relative`, and 4 * reach + 4."""
    tables = (*index.parties, index.options)
    if any(table.dtype != np.int64 for table in tables):
        return False
    # A relative table's numbers are up to 4 times as large, the options' 2 * (n + 1) times.
    return 48 * (len(tables) + 1) * (max(map(_largest, tables)) + 1) < ROOM


def _relative(index: Index, dtype: np.dtype[Any]) -> list[IntArray]:
    """The same choices from smaller numbers: only differences between options matter.

    What a party's first type adds is moved to the options' own row.
    """
    options = np.asarray(index.options, dtype=dtype)[None, :]
    tables = []
    for table in index.parties:
        whole = np.asarray(table, dtype=dtype)
        options = options + whole[:1]
        moved = whole - whole[:1]
        tables.append(moved - moved[:, :1])
    return [*tables, options - options[:, :1]]


def _largest(table: IntArray) -> int:
    return max(int(table.max()), -int(table.min()), 0) if table.size else 0


def words(values: IntArray, reach: int) -> Words:
    """Integers of which no sum in sight exceeds `reach`, as limbs.

    Where there are several, all are shifted alike so that the first limb has 60 bits: it
    decides nearly every comparison.
    """
    if reach < ROOM:
        return [values.astype(np.int64)]
    bits = reach.bit_length()
    lower = -(-(bits - TOP) // LIMB)
    values = values << (TOP + LIMB * lower - bits)
    limbs = []
    for _ in range(lower):
        limbs.append((values & ((1 << LIMB) - 1)).astype(np.int64))
        values = values >> LIMB
    limbs.append(values.astype(np.int64))
    return limbs[::-1]


def settled(limbs: Words) -> Words:
    """The same numbers with every limb but the first within 0..2**LIMB - 1."""
    if len(limbs) == 1:
        return limbs
    done: Words = []
    carry: npt.NDArray[np.int64] | int = 0
    for limb in reversed(limbs[1:]):
        limb = limb + carry
        carry = limb >> LIMB
        done.append(limb - (carry << LIMB))
    return [limbs[0] + carry, *reversed(done)]


def ranked(parts: Sequence[Words]) -> list[npt.NDArray[np.int64]]:
    """Several lists of numbers as int64 in the same order, across all of them."""
    if len(parts[0]) == 1:
        return [part[0] for part in parts]
    ready = [settled(part) for part in parts]
    limbs = [np.concatenate(pieces) for pieces in zip(*ready, strict=True)]
    rank = _dense(limbs[0])
    for limb in limbs[1:]:
        # Only numbers that agree so far need the next limb.
        size = np.bincount(rank)
        again = np.flatnonzero(size[rank] > 1)
        if not len(again):
            break
        step = size - 1
        start = np.cumsum(step) - step + np.arange(len(size))  # ranks with room for each group
        rank = start[rank]
        inner = _dense_pairs(rank[again], limb[again])
        rank[again] += inner
    return np.split(rank, np.cumsum([len(part[0]) for part in parts])[:-1])


def _dense(values: npt.NDArray[np.int64]) -> npt.NDArray[np.int64]:
    """Ranks from 0, the same for equal values."""
    order = np.argsort(values)
    ordered = values[order]
    rank = np.empty(len(values), dtype=np.int64)
    rank[order] = np.cumsum(np.concatenate([[False], ordered[1:] != ordered[:-1]]))
    return rank


def _dense_pairs(
    groups: npt.NDArray[np.int64], values: npt.NDArray[np.int64]
) -> npt.NDArray[np.int64]:
    """Ranks from 0 within each group."""
    order = np.lexsort((values, groups))
    group, value = groups[order], values[order]
    first = np.concatenate([[True], group[1:] != group[:-1]])
    new = first | np.concatenate([[True], value[1:] != value[:-1]])
    count = np.cumsum(new)
    base = np.maximum.accumulate(np.where(first, count, 0))
    rank = np.empty(len(values), dtype=np.int64)
    rank[order] = count - base
    return rank
