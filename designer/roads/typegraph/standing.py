"""What each type can expect, summed over classes instead of read off a table."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np

from designer.auditing.outcome import Standing
from designer.roads.typegraph.fibers import ROOM, Fibers
from designer.roads.typegraph.mechanism import GraphMechanism
from designer.setting.setting import IntArray


def standings(mechanism: GraphMechanism) -> tuple[Standing, ...]:
    """Expected payment, worth, utility, gain and closest lie, per party and type."""
    found: list[Standing] = []
    for work, pays, shift in zip(
        mechanism.works, mechanism.pays_by_class, mechanism.shifts, strict=True
    ):
        found += _of_party(work, pays, shift)
    return tuple(found)


def _of_party(work: Fibers, pays: IntArray, shift: Fraction) -> list[Standing]:
    """Averages given each true type a, over all classes, of what is reported as b."""
    types, party = work.types, work.setting.parties[work.party]
    small = pays.dtype == np.dtype(np.int64) and work.total * work.reach < ROOM
    dtype = np.dtype(np.int64) if small else np.dtype(object)
    mass: list[Any] = [0] * types
    outside: list[Any] = [0] * types
    worth: list[list[Any]] = [[0] * types for _ in range(types)]
    paid: list[list[Any]] = [[0] * types for _ in range(types)]
    for start, lengths in work.blocks():
        stop = start + len(lengths.room)
        sinks = lengths.sinks.astype(dtype)
        hoped = work.worths(start, stop).astype(dtype)
        told = pays[start:stop].astype(dtype)
        stay = work.outsides(start, stop).astype(dtype)
        for a in range(types):
            given = sinks[:, a]
            mass[a] += _whole(given.sum())
            outside[a] += _whole((given * stay[:, a]).sum())
            for b in range(types):
                worth[a][b] += _whole((given * hoped[:, a, b]).sum())
                paid[a][b] += _whole((given * told[:, b]).sum())
    return [
        Standing.of(
            party,
            a,
            Fraction(mass[a], work.total),
            [Fraction(v) / (mass[a] * work.den) for v in worth[a]],
            [Fraction(v) / (mass[a] * work.den) + shift for v in paid[a]],
            Fraction(outside[a]) / (mass[a] * work.den),
        )
        for a in range(types)
    ]


def _whole(value: Any) -> Any:
    """A sum as a Python number."""
    return value if isinstance(value, Fraction) else int(value)
